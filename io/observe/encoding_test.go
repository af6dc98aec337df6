package observe

import (
	"bytes"
	"compress/gzip"
	"errors"
	"io"
	"strings"
	"testing"
	"testing/iotest"
	"unicode/utf16"

	"github.com/google/go-cmp/cmp"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
	"pgregory.net/rapid"
)

// encoded writes a text in another encoding by the tables of golang.org/x/text.
func encoded(t testing.TB, text, encoding string, mark bool) string {
	t.Helper()
	bom := unicode.IgnoreBOM
	if mark {
		bom = unicode.UseBOM
	}
	var out string
	var err error
	switch encoding {
	case utf8Text:
		if out = text; mark {
			out = utf8Mark + text
		}
	case utf16Little:
		out, err = unicode.UTF16(unicode.LittleEndian, bom).NewEncoder().String(text)
	case utf16Big:
		out, err = unicode.UTF16(unicode.BigEndian, bom).NewEncoder().String(text)
	case windows1252:
		out, err = charmap.Windows1252.NewEncoder().String(text)
	}
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func zipped(t testing.TB, members ...string) string {
	t.Helper()
	var out bytes.Buffer
	for _, text := range members {
		w := gzip.NewWriter(&out)
		if _, err := io.WriteString(w, text); err != nil {
			t.Fatal(err)
		}
		if err := w.Close(); err != nil {
			t.Fatal(err)
		}
	}
	return out.String()
}

var townRequest = Request{Response: "z", Kind: Measure, Category: []string{"Straße"}, Keep: []string{"note"}}

// One table in every encoding, with every separator, packed or not, is the same table.
func TestRoundTrips(t *testing.T) {
	const text = "x,y,z,Straße,note\r\n1,2.5,3,Ä–Weg,\"a\nb\"\r\n\r\n4,5,<6,Ö,\"€ \"\"5\"\" | 5; 6\t\"\r\n7,8,9,,ÿ\n10,11,12,Ž,\n"
	want, err := read(text, townRequest)
	if err != nil || want.Len() != 2 || len(want.Aside) != 2 {
		t.Fatal(want, err)
	}
	tried := 0
	for _, separator := range []rune{',', ';', '\t', '|'} {
		for _, decimal := range []string{".", ","} {
			request := townRequest
			request.Format.DecimalComma = decimal == ","
			if separator == ',' && decimal == "," {
				continue
			}
			written := strings.ReplaceAll(text, ",", string(separator))
			written = strings.ReplaceAll(written, "2.5", "2"+decimal+"5")
			for _, encoding := range []string{utf8Text, utf16Little, utf16Big, windows1252} {
				for _, mark := range []bool{false, true} {
					for _, packed := range []bool{false, true} {
						file := encoded(t, written, encoding, mark)
						if packed {
							file = zipped(t, file)
						}
						got, err := readBoth(t, file, request)
						if err != nil {
							t.Fatalf("%q, %s, mark %v, packed %v: %v", separator, encoding, mark, packed, err)
						}
						if got.Separator != separator || got.Encoding != encoding {
							t.Errorf("%q told for %q, %s for %s", got.Separator, separator, got.Encoding, encoding)
						}
						got.Separator, got.Encoding = want.Separator, want.Encoding
						if diff := cmp.Diff(want, got); diff != "" {
							t.Errorf("%q, %s, mark %v, packed %v (-want +got):\n%s", separator, encoding, mark, packed, diff)
						}
						tried++
					}
				}
			}
		}
	}
	if tried != 7*16 {
		t.Errorf("%d ways were tried", tried)
	}
}

func TestEncodings(t *testing.T) {
	const head = "x,y,z,note\n1,2,3,"
	ascii := strings.Repeat("1,2,3,a\n", 20_000)
	none := func(where, what string) string { return "wells.csv: " + where + what + "\n" + adviceText }
	export := func(what string) string {
		return "wells.csv: the file is " + what + "\nexport the rows as CSV in UTF-8, or as GeoJSON in longitude and latitude"
	}
	const list = "wells.csv: the file is a JSON list, and drumlin reads GeoJSON or CSV\nwrite the rows as CSV, or as the features of a FeatureCollection with their values as properties"
	want := Request{Response: "z", Kind: Measure, Keep: []string{"note"}}
	tests := []struct{ name, text, encoding, note, err string }{
		{"ascii", head + "a", utf8Text, "a", ""},
		{"utf-8", head + "höhe", utf8Text, "höhe", ""},
		{"utf-8 beyond the plane", head + "𝛼", utf8Text, "𝛼", ""},
		{"a replacement character as such", head + "\ufffd", utf8Text, "\ufffd", ""},
		{"windows", head + "h\xf6he \x80", windows1252, "höhe €", ""},
		{"windows, one letter at the end of the file", head + "\xe9", windows1252, "é", ""},
		{"windows, far down", head + "a\n" + ascii + "1,2,3,\xfcber\n", windows1252, "a", ""},
		{"windows, then utf-8", head + "\xe9\n1,2,3,\xc3\xa9\n", "", "",
			"wells.csv: the file is in two encodings: \"é\" on line 3 is UTF-8, and the byte E9 on line 2 is not\n" + adviceOneEncoding},
		{"windows, then utf-8 far down", "x,y,z,note,h\xf6he\n" + strings.ReplaceAll(ascii, "\n", ",b\n") + "1,2,3,\u20ac,b\n", "", "",
			"wells.csv: the file is in two encodings: \"€\" on line 20002 is UTF-8, and the byte F6 on line 1 is not\n" + adviceOneEncoding},
		{"windows, then words of utf-8", head + "\xe9\n1,2,3,\u0416\u0436\n", "", "",
			"wells.csv: the file is in two encodings: \"Ж\" on line 3 is UTF-8, and the byte E9 on line 2 is not\n" + adviceOneEncoding},
		{"windows, pairs that are utf-8 by chance", head + "\xe9 Stra\xdf\x94 \xc4\x96 \xe9\x94\xbb", windows1252, "é Straß” Ä– é”»", ""},
		{"windows, then half a character of utf-8", head + "\xe9\n1,2,3,\xe2\x82", windows1252, "é", ""},
		{"utf-8, then windows", head + "é\n1,2,3,\xe9\n", "", "", none(`row 2 (line 3), column "note": `, `"\xe9" is not UTF-8 text`)},
		{"mark, then windows", utf8Mark + head + "\xe9\n", "", "", none(`row 1 (line 2), column "note": `, `"\xe9" is not UTF-8 text`)},
		{"neither", head + "\xe9\n1,2,3,a\x81\n", "", "", none(`row 2 (line 3), column "note": `, `"a\x81" is neither UTF-8 nor Windows-1252 text`)},
		{"neither in the header", "x,y,z,\x9d\n1,2,3,4\n", "", "", none("line 1: ", "the name of column 4 is neither UTF-8 nor Windows-1252 text")},
		{"nul", head + "a\x00", "", "", none("", "the file holds NUL bytes, so it is not text")},
		{"utf-16, half a character", encoded(t, head+"a", utf16Little, true) + "b", "", "", none(`row 1 (line 2), column "note": `, `"a\xff" is not UTF-16 text`)},
		{"utf-16, half a pair", encoded(t, head+"a", utf16Big, true) + "\xd8\x35", "", "", none(`row 1 (line 2), column "note": `, `"a\xff" is not UTF-16 text`)},
		{"utf-16, halves in the wrong order", encoded(t, head, utf16Big, false) + "\xdc\x35\xd8\x35\x00a", "", "", none(`row 1 (line 2), column "note": `, `"\xff\xffa" is not UTF-16 text`)},
		{"utf-16, a pair", encoded(t, head+"𝛼", utf16Little, false), utf16Little, "𝛼", ""},
		{"utf-16, letters of another script", encoded(t, head+"\u0416\u0100\u3000\u4e00", utf16Big, false), utf16Big, "ЖĀ\u3000一", ""},
		{"utf-16, nul within", encoded(t, head+"a\x00", utf16Big, true), "", "", none(`row 1 (line 2), column "note": `, `"a\x00" is not UTF-16 text`)},
		{"utf-32", "\xff\xfe\x00\x00x\x00\x00\x00", "", "", none("", "the file is UTF-32 text, which is not read")},
		{"database", "SQLite format 3\x00", "", "", export("a database, not a CSV table")},
		{"GeoPackage", "SQLite format 3\x00" + strings.Repeat("\x00", 52) + "GPKG", "", "", export("a GeoPackage, not a CSV table")},
		{"shapefile", "\x00\x00\x27\x0a\x00\x00", "", "", export("a shapefile, not a CSV table")},
		{"dBASE", "\x03\x1f\x07\x0e\x0e\x00\x00\x00\x61\x00" + strings.Repeat("\x00", 30), "", "", export("a dBASE table, not a CSV table")},
		{"Parquet", "PAR1\x15\x04", "", "", export("a Parquet table, not a CSV table")},
		{"picture", "\x89PNG\r\n\x1a\n", "", "", "wells.csv: the file is a picture, not a CSV table\nname the file that holds the table, as CSV or GeoJSON"},
		{"workbook", "PK\x03\x04\x14\x00[Content_Types].xml", "", "", "wells.csv: the file is a spreadsheet or another office document, not a CSV table\nsave the sheet as CSV in UTF-8"},
		{"JSON list", " [\n {\"x\":1}]", "", "", list}, {"JSON list of lists", "[[1,2]]", "", "", list}, {"JSON list in UTF-16", encoded(t, "[{", utf16Little, true), "", "", list},
		{"a column in brackets", "[x],y,z,note,x\n1,2,3,4,5\n", utf8Text, "4", ""},
		{"web page", "<!DOCTYPE html>\n<html>", "", "", none("", "the file is a web page or another marked-up document, not a CSV table")},
		{"old spreadsheet", "\xd0\xcf\x11\xe0\xa1\xb1", "", "", "wells.csv: the file is a spreadsheet or another office document, not a CSV table\nsave the sheet as CSV in UTF-8"},
		{"xz", "\xfd7zXZ\x00", "", "", "wells.csv: the file is compressed with xz\nunpack it, or compress it with gzip"},
		{"a column called PAR1", "x,y,z,note,PAR1\n1,2,3,4,5\n", utf8Text, "4", ""},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			table, err := readBoth(t, test.text, want)
			if err != nil {
				if got := err.Error() + "\n" + hint(err); got != test.err {
					t.Errorf("got %s\nwant %s", got, test.err)
				}
				return
			}
			note := table.Column("note")
			if table.Encoding != test.encoding || note.Level[note.Code[0]] != test.note || test.err != "" {
				t.Errorf("read as %s, note %q; want %s, %q, error %q", table.Encoding, note.Level, test.encoding, test.note, test.err)
			}
		})
	}
}

const adviceOneEncoding = "save the whole file in one encoding, UTF-8 for preference"

// The text does not depend on how the bytes arrive, and is that of another decoder.
func TestDecoderAgainstAnother(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		letters := rapid.SampledFrom([]rune("aé€ÿ,\n;Žäß"))
		body := string(rapid.SliceOfN(letters, 0, 5000).Draw(rt, "text"))
		encoding := rapid.SampledFrom([]string{utf8Text, utf16Little, utf16Big, windows1252}).Draw(rt, "encoding")
		if encoding == windows1252 { // in which "ß€ß€" would be UTF-8
			body = strings.NewReplacer("€", "a€", "Ž", ";Ž").Replace(body)
		}
		text := "aé;" + body
		file := encoded(t, text, encoding, rapid.Bool().Draw(rt, "mark"))
		for _, r := range []io.Reader{strings.NewReader(file), iotest.OneByteReader(strings.NewReader(file)), iotest.DataErrReader(strings.NewReader(file))} {
			decoded, _, err := openOrigin(r, "wells.csv", Format{})
			if err != nil {
				rt.Fatal(err)
			}
			got, err := io.ReadAll(decoded)
			if err != nil || string(got) != text {
				rt.Fatalf("%s: got %q, %v; want %q", encoding, got, err, text)
			}
		}
	})
}

// Any units are decoded as unicode/utf16 does, with a byte that is no UTF-8 where that has U+FFFD for half a pair.
func TestUTF16Units(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		unit := rapid.SampledFrom([]uint16{'a', 0xd800, 0xdbff, 0xdc00, 0xdfff, 0x3042, 0xfffd})
		units := rapid.SliceOfN(unit, 0, 4000).Draw(rt, "units")
		file := []byte("\xfe\xff\x00a")
		for _, u := range units {
			file = append(file, byte(u>>8), byte(u))
		}
		decoded, _, err := openOrigin(bytes.NewReader(file), "wells.csv", Format{})
		if err != nil {
			rt.Fatal(err)
		}
		got, err := io.ReadAll(decoded)
		want := "a" + string(utf16.Decode(units))
		if err != nil || strings.ReplaceAll(string(got), "\xff", "\ufffd") != want {
			rt.Fatalf("got %q, %v; want %q", got, err, want)
		}
	})
}

func TestGzip(t *testing.T) {
	const text = "x,y,z\n1,2,3\n1,2,4\n"
	packed := zipped(t, text)
	var noise strings.Builder // does not shrink, so that it can be cut in the middle of the rows
	noise.WriteString("x,y,z\n")
	for i := range 20_000 {
		noise.WriteString("1,2," + strings.Repeat("7", 1+i*i%13) + "\n")
	}
	long := zipped(t, noise.String())
	refused := func(what string) string { return "wells.csv: the compressed file " + what + "\n" + adviceWhole }
	tooLarge := func(than string) string {
		return "wells.csv: the compressed file unpacks to " + than + ", the most that is read\ncheck that this is the right file, and unpack it if it is"
	}
	checkFormats(t, measure, []formatCase{
		{"one member", packed, Format{}, "comma [3 4]"},
		{"several members", zipped(t, text[:9], text[9:13], "", text[13:]), Format{}, "comma [3 4]"},
		{"empty", zipped(t, ""), Format{}, "wells.csv: the file is empty\n" + adviceWhole},
		{"windows within", zipped(t, "x,y,z,é\n1,2,3,4\n"), Format{}, "comma [3]"},
		{"mark alone", gzipMark, Format{}, refused("is cut short")},
		{"cut in the head", packed[:9], Format{}, refused("is cut short")},
		{"cut in the text", packed[:len(packed)-12], Format{}, refused("is cut short")},
		{"cut in the checksum", packed[:len(packed)-3], Format{}, refused("is cut short")},
		{"cut far down", long[:len(long)-100], Format{}, refused("is cut short")},
		{"cut in the second member", packed + packed[:5], Format{}, refused("is cut short")},
		{"wrong checksum", packed[:len(packed)-8] + "abcd" + packed[len(packed)-4:], Format{}, refused("is damaged")},
		{"damaged", packed[:12] + "\xff\xff\xff\xff" + packed[16:], Format{}, refused("is damaged")},
		{"followed by something else", packed + "1,2,5\n1,2,6\n", Format{}, refused("is damaged")},
		{"twice", zipped(t, packed), Format{}, "wells.csv: the file is compressed with gzip twice\nunpack it once"},
		{"spreadsheet within", zipped(t, "PK\x03\x04"), Format{}, "wells.csv: the file is a spreadsheet or a zip archive, not a CSV table\n" + adviceUnzip},
		{"endless repetition", zipped(t, "x,y,z\n"+strings.Repeat("\n", 40<<20)), Format{}, tooLarge("more than 1000 times its own size")},
	})
}

// A file may unpack to so many bytes and not one more.
func TestGzipSize(t *testing.T) {
	const text = "x,y,z\n1,2,3\n"
	for most, want := range map[int64]string{int64(len(text)): "", int64(len(text)) - 1: "wells.csv: the compressed file unpacks to more than 11 bytes, the most that is read"} {
		unpacked, err := unpack(newLasting(strings.NewReader(zipped(t, text))), "wells.csv")
		if err != nil {
			t.Fatal(err)
		}
		unpacked.most = most
		_, err = io.ReadAll(unpacked)
		if got := err; (got == nil) != (want == "") || got != nil && got.Error() != want {
			t.Errorf("at most %d: %v", most, got)
		}
	}
}

// A reader that fails is told before what is wrong with the rows above, which may not be all.
func TestReaderFailsBelowThousands(t *testing.T) {
	broken := errors.New("the disk went away")
	_, err := Read(io.MultiReader(strings.NewReader("x,y,z\n1,2,\"1,234\"\n"), iotest.ErrReader(broken)), "wells.csv", measure)
	if !errors.Is(err, broken) {
		t.Error(err)
	}
}

// A reader that fails is told from a file that is cut short.
func TestGzipReaderFails(t *testing.T) {
	broken := errors.New("the disk went away")
	packed := zipped(t, "x,y,z\n1,2,3\n")
	for cut := range len(packed) {
		_, err := Read(io.MultiReader(strings.NewReader(packed[:cut]), iotest.ErrReader(broken)), "wells.csv", measure)
		if cut > 1 && (!errors.Is(err, broken) || err.Error() != "wells.csv: cannot be read: the disk went away") {
			t.Errorf("cut at %d: %v", cut, err)
		}
	}
}
