package archive

// ReadUpTo is Read with a limit that a test can reach.
var ReadUpTo = readUpTo
