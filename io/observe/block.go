package observe

import "slices"

// largestBlock is the size of the pieces in which a large file is held, where no record takes more.
const largestBlock = 4 << 20

// blocks cuts a file into pieces that end where a record ends. A file of unknown size is thus held once, where one
// growing slice would be copied and held twice.
type blocks struct {
	from *bounded
	size int    // bytes of the next block; doubles up to largestBlock, so that small files take little
	rest []byte // what was read of the record behind the last block
	err  error  // what ended the reading; from has no more to give
}

// next returns the next block and what comes after it: nil for another block, io.EOF, or the failure of the reader.
// Only a block with nothing but an end or a failure behind it may be empty or end within a record.
func (b *blocks) next() ([]byte, error) {
	block := append(make([]byte, 0, b.size), b.rest...)
	b.size = min(2*b.size, largestBlock)
	for {
		for len(block) < cap(block) && b.err == nil {
			var n int
			n, b.err = b.from.Read(block[len(block):cap(block)])
			block = block[:len(block)+n]
		}
		if b.err != nil {
			return slices.Clone(block), b.err // the room left over may be most of the block
		}
		if whole := len(block) - b.from.size; whole > 0 { // bounded counts the bytes since the last end of a record
			b.rest = block[whole:]
			return block[:whole:whole], nil
		}
		block = slices.Grow(block, len(block))
	}
}
