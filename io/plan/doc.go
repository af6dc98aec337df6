// Package plan holds the settings of a run and the one list of words they are said with, and reads plans of many
// regions.
//
// A setting is a field of [Settings] and an entry of [Words]: the flags of the command line, the keys of a plan, the
// help and the settings recorded in summary.json are all made from that list, so a new setting is one field and one
// entry. A field that is nil was not said.
//
// Settings go through three stages. What somebody said is layered with [Settings.Over]; [Settings.Validate] refuses
// what cannot be meant, as far as no data is needed to tell; [Settings.Resolve] lays them over [Defaults] and makes
// the choices that need no data, each with its reason. Choices that need the data are added by whoever has the data,
// with [Settings.Choose].
//
// A plan of many regions is TOML: [defaults] and [region.NAME] take the words, [regions] says where the regions come from
// and [pictures] which colours their maps share. [ReadBatch] reads one into a [Batch] and refuses, with line and column,
// what can be seen to be wrong without the data; [Batch.Region] lays a region's words over the defaults and resolves them.
package plan
