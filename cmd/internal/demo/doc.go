// Package demo makes the data and the commands of drumlin's demonstrations: one of single maps, and one of a batch with
// its plan.
//
// All of it is invented. Orrimay, its zones and the plant marshlight do not exist; neither do the Vessal Banks and their
// villages, whose coordinates lie in the open ocean, farther from land than almost any other place, nor the isles of
// Zarrowmund and their 24 districts, the setting of the batch, in the same empty part of the ocean. The same bytes come
// out every time.
package demo
