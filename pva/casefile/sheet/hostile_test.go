package sheet

import (
	"archive/zip"
	"bytes"
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"runtime"
	"strings"
	"testing"
	"time"
)

// refused reads a workbook that must be refused with these words, soon and
// without using much memory.
func refused(t *testing.T, what string, data []byte, want string) {
	t.Helper()
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	start := time.Now()
	c, errs := Read("w.xlsx", data)
	took := time.Since(start)
	runtime.ReadMemStats(&after)
	if c != nil || len(errs) != 1 || !strings.Contains(errs[0].Error(), want) {
		t.Errorf("%s: %v, want %q", what, errs, want)
	}
	if took > 10*time.Second { // a busy machine; alone it is below two
		t.Errorf("%s: took %v", what, took)
	}
	if used := after.TotalAlloc - before.TotalAlloc; used > 700<<20 {
		t.Errorf("%s: %d MB were allocated in all", what, used>>20)
	}
}

// stored packs parts with headers that the test sets.
func stored(t *testing.T, ps []part, change func(name string, h *zip.FileHeader)) []byte {
	t.Helper()
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	for _, p := range ps {
		h := &zip.FileHeader{Name: p.name, Method: zip.Store, CRC32: crc32.ChecksumIEEE([]byte(p.text)), CompressedSize64: uint64(len(p.text)), UncompressedSize64: uint64(len(p.text))}
		change(p.name, h)
		w, err := z.CreateRaw(h)
		if err == nil {
			_, err = w.Write([]byte(p.text))
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func TestHostileArchives(t *testing.T) {
	good := parts(smallRows(goodRate))
	same := func(string, *zip.FileHeader) {}
	if _, errs := Read("w.xlsx", stored(t, good, same)); len(errs) > 0 {
		t.Fatal(errs)
	}
	refused(t, "nothing", nil, "is not a workbook")
	refused(t, "text", []byte("[case]\n"), "is not a workbook")
	refused(t, "an old workbook", []byte("\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1xxxx"), "older form")
	refused(t, "half", small(t)[:900], "is a damaged workbook")
	refused(t, "too large", append([]byte("PK\x03\x04"), make([]byte, LargestFile)...), "is larger than 64 MB")
	refused(t, "another archive", packed(t, []part{{"notes.txt", "my notes"}}), "the part _rels/.rels is missing")

	zeros := strings.Repeat("\x00", 70<<20)
	refused(t, "a bomb", packed(t, append(good, part{"xl/media/image1.png", zeros})), "unzips to more than 64 MB")
	var many []part
	for i := range 3 {
		many = append(many, part{fmt.Sprintf("xl/media/image%d.png", i), zeros[:50<<20]})
	}
	refused(t, "a bomb in pieces", packed(t, append(good, many...)), "unzips to more than 128 MB")
	many = nil
	for i := range mostParts {
		many = append(many, part{fmt.Sprintf("xl/media/%d.png", i), ""})
	}
	refused(t, "many parts", packed(t, append(good, many...)), "holds 2007 parts")
	// A part that says it is short and is not.
	refused(t, "a part longer than it says", liar(t, good, 10), "is damaged: the part xl/media/x.png")
	refused(t, "a part shorter than it says", liar(t, good, 5000), "is damaged: the part xl/media/x.png")

	for _, name := range []string{"../evil", "/etc/x", "xl/../../x", `xl\x`, "C:/x", "xl//x", "x\x00y", "xl/./x", strings.Repeat("x", 300)} {
		refused(t, name, packed(t, append(good, part{name, "x"})), "holds a part with")
	}
	refused(t, "a part twice", packed(t, append(good, part{"xl/worksheets/sheet1.xml", "x"})), "twice")
	refused(t, "a part twice but for case", packed(t, append(good, part{"XL/worksheets/Sheet1.xml", "x"})), "twice")
	folder := bytes.ReplaceAll(stored(t, append(good, part{"xl/media#", "x"}), same), []byte("xl/media#"), []byte("xl/media/"))
	refused(t, "a folder with data", folder, "holds data")

	at := func(name string, f func(h *zip.FileHeader)) []byte {
		return stored(t, good, func(n string, h *zip.FileHeader) {
			if n == name {
				f(h)
			}
		})
	}
	sheet := "xl/worksheets/sheet1.xml"
	refused(t, "a password", at(sheet, func(h *zip.FileHeader) { h.Flags |= 1 }), "protected by a password")
	refused(t, "an unknown packing", at(sheet, func(h *zip.FileHeader) { h.Method = 14 }), "packed in an unknown way")
	refused(t, "a wrong checksum", at(sheet, func(h *zip.FileHeader) { h.CRC32++ }), "fails its checksum")
	refused(t, "a checksum of zero", at(sheet, func(h *zip.FileHeader) { h.CRC32 = 0 }), "fails its checksum")
	refused(t, "a wrong checksum elsewhere", at("xl/styles.xml", func(h *zip.FileHeader) { h.CRC32 = 0 }), "fails its checksum")
}

// liar adds a part whose list entry says another length than its data has.
func liar(t *testing.T, ps []part, says uint64) []byte {
	t.Helper()
	text := strings.Repeat("x", 1000)
	data := stored(t, append(append([]part(nil), ps...), part{"xl/media/x.png", text}), func(string, *zip.FileHeader) {})
	at := bytes.LastIndex(data, []byte("PK\x01\x02")) // the last entry of the list
	binary.LittleEndian.PutUint32(data[at+24:], uint32(says))
	return data
}

func TestHostileXML(t *testing.T) {
	good := parts(smallRows(goodRate))
	sheet := "xl/worksheets/sheet1.xml"
	with := func(name, text string) []byte { return packed(t, changed(good, name, text)) }
	plain := sheetXML(smallRows(goodRate))

	laughs := `<!DOCTYPE x [<!ENTITY a "ha"><!ENTITY b "&a;&a;&a;&a;&a;&a;&a;&a;&a;&a;">]>`
	refused(t, "entities", with(sheet, laughs+strings.Replace(plain, "0.45", "&b;", 1)), "holds a document type or entities")
	refused(t, "entities among the texts", with("xl/sharedStrings.xml", laughs+textsXML), "holds a document type or entities")
	refused(t, "entities in the links", with("_rels/.rels", laughs+relsOfAll), "holds a document type or entities")
	refused(t, "an unknown entity", with(sheet, strings.Replace(plain, "0.45", "&b;", 1)), "is not the XML it should be")

	refused(t, "a sheet cut short", with(sheet, plain[:len(plain)-40]), "is not the XML it should be")
	refused(t, "a sheet with a tail", with(sheet, plain+"<x/>"), "is not the XML it should be")
	refused(t, "a tail of text", with(sheet, plain+"x"), "is not the XML it should be")
	refused(t, "an empty sheet", with(sheet, ""), "is not the XML it should be")
	refused(t, "another root", with(sheet, textsXML), "is not the XML it should be")
	refused(t, "broken late", with(sheet, strings.Replace(plain, "</sheetData>", "</sheetData><a><b></a>", 1)), "is not the XML it should be")
	refused(t, "another encoding", with(sheet, `<?xml version="1.0" encoding="UTF-16"?>`+plain), "is not the XML it should be")
	refused(t, "an attribute twice", with(sheet, strings.Replace(plain, `r="B6"`, `r="B6" r="B7"`, 1)), "is not the XML it should be")
	refused(t, "a cell twice", with(sheet, strings.Replace(plain, goodRate, goodRate+`<c r="B6"><v>0.9</v></c>`, 1)), "is not the XML it should be")
	refused(t, "a value twice", with(sheet, strings.Replace(plain, "<v>0.45</v>", "<v>0.45</v><v>0.9</v>", 1)), "is not the XML it should be")
	refused(t, "a row twice", with(sheet, strings.Replace(plain, `<row r="6">`, `<row r="5">`, 1)), "is not the XML it should be")
	refused(t, "a cell of another row", with(sheet, strings.Replace(plain, `r="B6"`, `r="B7"`, 1)), "is not the XML it should be")
	refused(t, "two tables of cells", with(sheet, strings.Replace(plain, "</sheetData>", "</sheetData><sheetData/>", 1)), "is not the XML it should be")
	refused(t, "something else among the cells", with(sheet, strings.Replace(plain, goodRate, "<x>"+goodRate+"</x>", 1)), "is not the XML it should be")
	refused(t, "two lists of texts", with("xl/_rels/workbook.xml.rels", strings.Replace(relsBook, "</Relationships>", `<Relationship Id="rId9" Type="x/sharedStrings" Target="sharedStrings.xml"/></Relationships>`, 1)), "two lists of texts")
	refused(t, "a link twice", with("xl/_rels/workbook.xml.rels", strings.Replace(relsBook, "rId2", "rId1", 1)), "is not the XML it should be")
	refused(t, "a sheet elsewhere", with("xl/_rels/workbook.xml.rels", strings.Replace(relsBook, `Target="worksheets/sheet1.xml"`, `Target="http://example.org/x" TargetMode="External"`, 1)), "is not the XML it should be")
	refused(t, "a sheet that is missing", with("xl/_rels/workbook.xml.rels", strings.Replace(relsBook, `sheet1.xml`, `../../../sheet1.xml`, 1)), "is missing")
	refused(t, "two sheets of a name", with("xl/workbook.xml", strings.Replace(bookXML, "</sheets>", `<sheet name="INPUTS" sheetId="2" r:id="rId1"/></sheets>`, 1)), "two sheets of the name")

	deep := strings.Repeat("<a>", 100_000)
	refused(t, "deep nesting", with(sheet, strings.Replace(plain, "</sheetData>", "</sheetData>"+deep, 1)), "too deeply nested")
	var attrs strings.Builder
	for i := range 50_000 {
		fmt.Fprintf(&attrs, ` a%d="1"`, i)
	}
	refused(t, "attributes without end", with(sheet, strings.Replace(plain, "<sheetData>", "<sheetData"+attrs.String()+">", 1)), "too deeply nested")

	far := func(ref string) []byte {
		row := strings.TrimLeft(ref, "ABCDEFGHIJKLMNOPQRSTUVWXYZ")
		return with(sheet, strings.Replace(plain, "</sheetData>", `<row r="`+row+`"><c r="`+ref+`"><v>1</v></c></row></sheetData>`, 1))
	}
	refused(t, "a row beyond the last", far("B1048577"), "beyond the last there is")
	refused(t, "a row far beyond", far("B99999999999999999999"), "is not the XML it should be")
	refused(t, "a column beyond the last", far("XFE9"), "is not the XML it should be")
	if _, errs := Read("w.xlsx", far("XFD1048576")); len(errs) > 0 {
		t.Errorf("a remark in the last cell there is: %v", errs)
	}

	refused(t, "a sheet of 17 MB", with(sheet, strings.Replace(plain, "<sheetData>", strings.Repeat(" ", 17<<20)+"<sheetData>", 1)), "unzips to more than 16 MB")
	refused(t, "a long text", with("xl/sharedStrings.xml", strings.Replace(textsXML, "pulse", strings.Repeat("pulse ", 1<<18), 1)), "a text longer than any cell can be")
	refused(t, "texts without end", with("xl/sharedStrings.xml", strings.Replace(textsXML, "</sst>", strings.Repeat("<si/>", mostTexts)+"</sst>", 1)), "holds more than 300000 texts")
	refused(t, "a long number format", with("xl/styles.xml", strings.Replace(stylesXML, `yyyy\-`, strings.Repeat("y", 60_000), 1)), "number formats")
	var formats strings.Builder
	for i := range mostFormats {
		fmt.Fprintf(&formats, `<numFmt numFmtId="%d" formatCode="0"/>`, 200+i)
	}
	refused(t, "number formats without end", with("xl/styles.xml", strings.Replace(stylesXML, "</numFmts>", formats.String()+"</numFmts>", 1)), "number formats")
	refused(t, "elements without end", with("xl/sharedStrings.xml", strings.Replace(textsXML, "</sst>", strings.Repeat("<a/>", mostElements)+"</sst>", 1)), "holds too much")
	var merges strings.Builder
	for i := range 100_000 {
		fmt.Fprintf(&merges, `<mergeCell ref="J%d:K%d"/>`, i+1, i+1)
	}
	refused(t, "merged areas without end", with(sheet, strings.Replace(plain, "</sheetData>", "</sheetData><mergeCells>"+merges.String()+"</mergeCells>", 1)), "merged areas")
	var rows strings.Builder
	for i := range 150_000 {
		fmt.Fprintf(&rows, `<row><c t="s"><v>0</v></c><c><v>%d</v></c></row>`, i)
	}
	refused(t, "rows without end", with(sheet, strings.Replace(plain, "</sheetData>", rows.String()+"</sheetData>", 1)), "has 150007 rows")
}
