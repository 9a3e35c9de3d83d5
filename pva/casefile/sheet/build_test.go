package sheet

import (
	"archive/zip"
	"bytes"
	"fmt"
	"strings"
	"testing"
)

// part is one part of a workbook made by hand.
type part struct{ name, text string }

const (
	relsOfAll = `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="rId1" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/officeDocument" Target="xl/workbook.xml"/></Relationships>`
	relsBook  = `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="rId1" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/worksheet" Target="worksheets/sheet1.xml"/><Relationship Id="rId2" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/styles" Target="styles.xml"/><Relationship Id="rId3" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/sharedStrings" Target="/xl/sharedStrings.xml"/></Relationships>`
	bookXML   = `<workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"><sheets><sheet name="Inputs" sheetId="1" r:id="rId1"/></sheets></workbook>`
	typesXML  = `<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types"/>`
	stylesXML = `<styleSheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><numFmts count="4"><numFmt numFmtId="164" formatCode="yyyy\-mm\-dd"/><numFmt numFmtId="165" formatCode="[=0]0\ &quot;days&quot;;[Red]General;[$-409]0.0%"/><numFmt numFmtId="166" formatCode="[hh]:mm"/><numFmt numFmtId="167" formatCode="0.00E+00"/></numFmts><cellXfs count="7"><xf numFmtId="0"/><xf numFmtId="164"/><xf numFmtId="165"/><xf numFmtId="14"/><xf numFmtId="166"/><xf numFmtId="167"/><xf numFmtId="10"/></cellXfs></styleSheet>`
	textsXML  = `<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" count="3" uniqueCount="3"><si><t>pulse</t></si><si><r><rPr><b/></rPr><t>nest</t></r><r><t xml:space="preserve"> survey</t></r><rPh sb="0" eb="1"><t>unread</t></rPh></si><si><t>_x0041_ note_x000D_
of two lines, _x005F_x0041_</t></si></sst>`
)

// inline is a cell with its text in it.
func inline(ref, text string) string {
	text = strings.NewReplacer("&", "&amp;", "<", "&lt;").Replace(text)
	return fmt.Sprintf(`<c r="%s" t="inlineStr"><is><t xml:space="preserve">%s</t></is></c>`, ref, text)
}

const headRow = `<row r="1"><c r="A1" t="inlineStr"><is><t>Key</t></is></c><c r="B1" t="inlineStr"><is><t>Value</t></is></c><c r="C1" t="inlineStr"><is><t>Unit</t></is></c><c r="D1" t="inlineStr"><is><t>Source</t></is></c><c r="E1" t="inlineStr"><is><t>Note</t></is></c><c r="G1" t="inlineStr"><is><t>Status</t></is></c></row>`

// smallRows is a case as rows 2 to 7 of a sheet; the value of births.rate is left
// to the test.
func smallRows(rate string) string {
	row := func(n int, key, value string) string {
		return fmt.Sprintf(`<row r="%d">%s%s</row>`, n, inline(fmt.Sprintf("A%d", n), key), value)
	}
	return headRow + row(2, "question.threshold", `<c r="B2"><v>20</v></c>`) + row(3, "question.horizon", `<c r="B3"><v>50</v></c>`) +
		row(4, "start.abundance", `<c r="B4" s="2"><v>180</v></c>`) + row(5, "births.breeding", `<c r="B5" t="s"><v>0</v></c>`) +
		row(6, "births.rate", rate) + row(7, "deaths.fraction", `<c r="B7" s="6"><v>0.27000000000000002</v></c>`)
}

func sheetXML(rows string) string {
	return `<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><dimension ref="A1:XFD1048576"/><sheetData>` + rows + `</sheetData></worksheet>`
}

// parts is the parts of a small workbook with these rows.
func parts(rows string) []part {
	return []part{{"[Content_Types].xml", typesXML}, {"_rels/.rels", relsOfAll}, {"xl/workbook.xml", bookXML}, {"xl/_rels/workbook.xml.rels", relsBook},
		{"xl/styles.xml", stylesXML}, {"xl/sharedStrings.xml", textsXML}, {"xl/worksheets/sheet1.xml", sheetXML(rows)}}
}

// changed is parts with one put in the place of another of its name, or added.
func changed(ps []part, name, text string) []part {
	out := append([]part(nil), ps...)
	for i := range out {
		if out[i].name == name {
			out[i].text = text
			return out
		}
	}
	return append(out, part{name, text})
}

func packed(t testing.TB, ps []part) []byte {
	t.Helper()
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	for _, p := range ps {
		w, err := z.Create(p.name)
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

const goodRate = `<c r="B6"><v>0.45</v></c>`

func small(t testing.TB) []byte { return packed(t, parts(smallRows(goodRate))) }
