// Package draft keeps what pictures are made of until they can be drawn. Maps of one batch share their colours, and
// those are known only when the last region is in.
package draft
