// Package batch runs a plan of many regions: it finds them, has each fitted by package pipeline into a folder of its own,
// keeps the ledger of what they came to, and draws what needs all of them.
package batch
