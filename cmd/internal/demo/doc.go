// Package demo makes the data and the commands of drumlin's demonstration.
//
// All of it is invented. Orrimay, its zones and the plant marshlight do not exist; neither do the Vessal Banks and their
// villages, whose coordinates lie in the open ocean, farther from land than almost any other place. The same bytes come
// out every time.
package demo
