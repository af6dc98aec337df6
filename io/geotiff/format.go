package geotiff

import (
	"encoding/binary"
	"encoding/xml"
	"math"
	"slices"
	"strings"
)

// format lays out a file: little-endian, TIFF or BigTIFF.
type format struct {
	big   bool
	start []uint64 // offset of the first tile of each level
}

// field is an entry of a directory to be written, with its values little-endian.
type field struct {
	tag, kind uint16
	data      []byte
}

// plan finds where the tiles of each level start and returns the size of the file.
func (f *format) plan(g Grid, levels []*level) uint64 {
	f.start = make([]uint64, len(levels))
	at := uint64(len(f.head(g, levels)))
	for k := len(levels) - 1; k >= 0; k-- {
		f.start[k] = at
		for _, band := range levels[k].tiles {
			for _, tile := range band {
				at += uint64(len(tile))
			}
		}
	}
	return at
}

// head is the header and all directories. Its length does not depend on where the tiles start.
func (f *format) head(g Grid, levels []*level) []byte {
	b := []byte("II*\x00")
	if f.big {
		b = []byte("II+\x00\x08\x00\x00\x00")
	}
	b = f.word(b, uint64(len(b)+f.wordSize()))
	for k, l := range levels {
		fields := f.picture(g, l, f.start[k])
		if k == 0 {
			fields = append(fields, f.place(g)...)
		} else {
			const overview = 1
			fields = append(fields, f.long(tagSubfile, overview))
		}
		b = f.directory(b, fields, k == len(levels)-1)
	}
	return b
}

func (f *format) wordSize() int {
	if f.big {
		return 8
	}
	return 4
}

// word appends an offset or a count.
func (f *format) word(b []byte, v uint64) []byte {
	if f.big {
		return binary.LittleEndian.AppendUint64(b, v)
	}
	return binary.LittleEndian.AppendUint32(b, uint32(v))
}

// directory appends a directory and after it the values that do not fit into its entries.
func (f *format) directory(b []byte, fields []field, last bool) []byte {
	slices.SortFunc(fields, func(a, b field) int { return int(a.tag) - int(b.tag) })
	size := f.wordSize()
	beside := len(b) + 2 + 12*len(fields) + size
	if f.big {
		beside = len(b) + 8 + 20*len(fields) + size
	}
	var values []byte
	if f.big {
		b = binary.LittleEndian.AppendUint64(b, uint64(len(fields)))
	} else {
		b = binary.LittleEndian.AppendUint16(b, uint16(len(fields)))
	}
	for _, e := range fields {
		b = binary.LittleEndian.AppendUint16(b, e.tag)
		b = binary.LittleEndian.AppendUint16(b, e.kind)
		b = f.word(b, uint64(len(e.data))/fieldSize(e.kind))
		if len(e.data) <= size {
			b = append(append(b, e.data...), make([]byte, size-len(e.data))...)
			continue
		}
		b = f.word(b, uint64(beside+len(values)))
		values = append(values, e.data...)
		values = append(values, make([]byte, -len(values)&7)...) // the next ones start on a word
	}
	// Values are padded to 8 bytes, so the next directory starts on a word too: a header and entries have an even length.
	next := uint64(beside + len(values))
	if last {
		next = 0
	}
	return append(f.word(b, next), values...)
}

// picture is the fields of a raster or an overview: its size, how cells are stored, and where its tiles are.
func (f *format) picture(g Grid, l *level, start uint64) []field {
	const whole, apart, minIsBlack, float = 1, 2, 1, 3
	bands := len(g.Bands)
	planar := uint16(whole)
	if bands > 1 {
		planar = apart
	}
	fields := []field{
		f.long(tagWidth, uint32(l.width)), f.long(tagHeight, uint32(l.height)),
		f.shorts(tagBitsPerSample, slices.Repeat([]uint16{32}, bands)...), f.shorts(tagSampleFormat, slices.Repeat([]uint16{float}, bands)...),
		f.shorts(tagCompression, compressDeflate), f.shorts(tagPredictor, predictFloat),
		f.shorts(tagPhotometric, minIsBlack), f.shorts(tagSamplesPerPixel, uint16(bands)), f.shorts(tagPlanar, planar),
		f.shorts(tagTileWidth, tileSide), f.shorts(tagTileHeight, tileSide),
		f.text(tagNoData, "nan"),
	}
	if bands > 1 {
		fields = append(fields, f.shorts(tagExtraSamples, make([]uint16, bands-1)...)) // 0: no colour, no transparency
	}
	offsets := field{tag: tagTileOffsets, kind: fieldLong}
	if f.big {
		offsets.kind = fieldLong8
	}
	counts := field{tag: tagTileByteCounts, kind: fieldLong}
	for _, band := range l.tiles {
		for _, tile := range band {
			offsets.data = f.word(offsets.data, start)
			counts.data = binary.LittleEndian.AppendUint32(counts.data, uint32(len(tile)))
			start += uint64(len(tile))
		}
	}
	return append(fields, offsets, counts)
}

// place is the fields that tell where the raster lies and what its bands are called.
func (f *format) place(g Grid) []field {
	keys, numbers, text := g.keys()
	fields := []field{
		f.doubles(tagPixelScale, g.CellX, g.CellY, 0),
		f.doubles(tagTiepoint, 0, 0, 0, g.X0, g.Y0, 0),
		f.shorts(tagGeoKeys, keys...),
		f.text(tagMetadata, describe(g.Bands)),
	}
	if len(numbers) > 0 {
		fields = append(fields, f.doubles(tagGeoDoubles, numbers...))
	}
	if text != "" {
		fields = append(fields, f.text(tagGeoASCII, text))
	}
	return fields
}

func (f *format) long(tag uint16, v uint32) field {
	return field{tag, fieldLong, binary.LittleEndian.AppendUint32(nil, v)}
}

func (f *format) shorts(tag uint16, v ...uint16) field {
	e := field{tag: tag, kind: fieldShort}
	for _, v := range v {
		e.data = binary.LittleEndian.AppendUint16(e.data, v)
	}
	return e
}

func (f *format) doubles(tag uint16, v ...float64) field {
	e := field{tag: tag, kind: fieldDouble}
	for _, v := range v {
		e.data = binary.LittleEndian.AppendUint64(e.data, math.Float64bits(v))
	}
	return e
}

func (f *format) text(tag uint16, text string) field {
	return field{tag, fieldASCII, append([]byte(text), 0)}
}

// describe names the bands in the XML text that other software looks for. Its texts are escaped once more than XML asks
// (common practice, no source).
func describe(names []string) string {
	type item struct {
		Name   string `xml:"name,attr"`
		Sample int    `xml:"sample,attr"`
		Role   string `xml:"role,attr"`
		Text   string `xml:",chardata"`
	}
	escaped := strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;", `"`, "&quot;")
	var text strings.Builder
	text.WriteString("<GDALMetadata>\n")
	for i, name := range names {
		b, err := xml.Marshal(struct {
			XMLName xml.Name `xml:"Item"`
			item
		}{item: item{"DESCRIPTION", i, "description", escaped.Replace(name)}})
		if err != nil {
			panic("geotiff: a name that is no text: " + err.Error())
		}
		text.WriteString("  ")
		text.Write(b)
		text.WriteString("\n")
	}
	text.WriteString("</GDALMetadata>\n")
	return text.String()
}
