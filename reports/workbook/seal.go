package workbook

import (
	"archive/zip"
	"bytes"
	"encoding/xml"
	"fmt"
	"io"
	"path"
	"regexp"
	"sort"
	"strconv"
	"strings"
	"time"
)

// packedAt is the time of every part in the zip: the earliest it can hold.
var packedAt = time.Date(1980, 1, 1, 0, 0, 0, 0, time.UTC)

// seal finishes the saved workbook: it puts formulas beside the stored values
// (the library stores one or the other), puts the charts in, sorts the list of
// content types and the parts, and stamps one fixed time, so that the same
// report always gives the same bytes.
func (b *book) seal(saved []byte) ([]byte, error) {
	z, err := zip.NewReader(bytes.NewReader(saved), int64(len(saved)))
	if err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	parts := map[string][]byte{}
	names := make([]string, 0, len(z.File))
	for _, e := range z.File {
		r, err := e.Open()
		if err != nil {
			return nil, fmt.Errorf("the report workbook: %w", err)
		}
		data, err := io.ReadAll(r)
		r.Close()
		if err != nil {
			return nil, fmt.Errorf("the report workbook: %w", err)
		}
		if _, twice := parts[e.Name]; !twice {
			names = append(names, e.Name)
		}
		parts[e.Name] = data
	}
	sheets, err := sheetParts(parts)
	if err != nil {
		return nil, err
	}
	shared, err := sharedTexts(parts["xl/sharedStrings.xml"])
	if err != nil {
		return nil, err
	}
	for sheet, cells := range b.wants {
		part := sheets[sheet]
		if parts[part], err = withFormulas(parts[part], cells, shared); err != nil {
			return nil, fmt.Errorf("the report workbook: sheet %s: %w", sheet, err)
		}
	}
	for i, chart := range b.charts {
		name := "xl/charts/chart" + strconv.Itoa(i+1) + ".xml"
		if _, ok := parts[name]; !ok {
			return nil, fmt.Errorf("the report workbook: no part %s for a chart", name)
		}
		parts[name] = []byte(chart)
	}
	if parts["[Content_Types].xml"], err = sortedTypes(parts["[Content_Types].xml"]); err != nil {
		return nil, err
	}
	return packed(parts, names)
}

// packed zips the parts: the content types first, as some readers want them,
// then by name.
func packed(parts map[string][]byte, names []string) ([]byte, error) {
	sort.Slice(names, func(i, j int) bool {
		first := func(n string) bool { return n == "[Content_Types].xml" }
		if first(names[i]) != first(names[j]) {
			return first(names[i])
		}
		return names[i] < names[j]
	})
	var out bytes.Buffer
	w := zip.NewWriter(&out)
	for _, name := range names {
		e, err := w.CreateHeader(&zip.FileHeader{Name: name, Method: zip.Deflate, Modified: packedAt})
		if err == nil {
			_, err = e.Write(parts[name])
		}
		if err != nil {
			return nil, fmt.Errorf("the report workbook: %w", err)
		}
	}
	if err := w.Close(); err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	return out.Bytes(), nil
}

// sheetParts maps sheet names to their parts.
func sheetParts(parts map[string][]byte) (map[string]string, error) {
	var book struct {
		Sheets []struct {
			Name string `xml:"name,attr"`
			ID   string `xml:"http://schemas.openxmlformats.org/officeDocument/2006/relationships id,attr"`
		} `xml:"sheets>sheet"`
	}
	var rels struct {
		Relationship []struct {
			ID     string `xml:"Id,attr"`
			Target string `xml:"Target,attr"`
		} `xml:"Relationship"`
	}
	if err := xml.Unmarshal(parts["xl/workbook.xml"], &book); err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	if err := xml.Unmarshal(parts["xl/_rels/workbook.xml.rels"], &rels); err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	target := map[string]string{}
	for _, r := range rels.Relationship {
		if strings.HasPrefix(r.Target, "/") {
			target[r.ID] = r.Target[1:]
		} else {
			target[r.ID] = path.Join("xl", r.Target)
		}
	}
	out := map[string]string{}
	for _, s := range book.Sheets {
		out[s.Name] = target[s.ID]
	}
	return out, nil
}

// sharedTexts are the plain texts that cells point to.
func sharedTexts(part []byte) ([]string, error) {
	if part == nil {
		return nil, nil
	}
	var table struct {
		Item []struct {
			Text string `xml:"t"`
		} `xml:"si"`
	}
	if err := xml.Unmarshal(part, &table); err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	out := make([]string, len(table.Item))
	for i, item := range table.Item {
		out[i] = item.Text
	}
	return out, nil
}

// filledCell is a cell with a value, as the library writes it.
var filledCell = regexp.MustCompile(`<c r="([A-Z]+[0-9]+)"([^>]*)><v[^>]*>([^<]*)</v></c>`)

// withFormulas writes each wanted formula before the value of its cell. A cell
// that is not found is a bug of this package and an error, not a gap.
func withFormulas(sheet []byte, wants map[string]string, shared []string) ([]byte, error) {
	found := 0
	var failure error
	out := filledCell.ReplaceAllFunc(sheet, func(cell []byte) []byte {
		m := filledCell.FindSubmatch(cell)
		formula, ok := wants[string(m[1])]
		if !ok {
			return cell
		}
		found++
		attributes, value := string(m[2]), string(m[3])
		if strings.Contains(attributes, ` t="s"`) {
			i, err := strconv.Atoi(value)
			if err != nil || i < 0 || i >= len(shared) {
				failure = fmt.Errorf("cell %s points to no text", m[1])
				return cell
			}
			attributes = strings.Replace(attributes, ` t="s"`, ` t="str"`, 1)
			value = escapedBare(shared[i])
		}
		return []byte(`<c r="` + string(m[1]) + `"` + attributes + `><f>` + escapedBare(formula) + `</f><v>` + value + `</v></c>`)
	})
	if failure == nil && found != len(wants) {
		failure = fmt.Errorf("%d formulas found no value to stand by", len(wants)-found)
	}
	return out, failure
}

func escapedBare(s string) string {
	return strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;").Replace(s)
}

// sortedTypes sorts the list of content types, which the library writes in the
// order of a map.
func sortedTypes(part []byte) ([]byte, error) {
	type entry struct {
		Extension   string `xml:"Extension,attr,omitempty"`
		PartName    string `xml:"PartName,attr,omitempty"`
		ContentType string `xml:"ContentType,attr"`
	}
	var types struct {
		XMLName  xml.Name `xml:"http://schemas.openxmlformats.org/package/2006/content-types Types"`
		Default  []entry  `xml:"Default"`
		Override []entry  `xml:"Override"`
	}
	if err := xml.Unmarshal(part, &types); err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	sort.Slice(types.Default, func(i, j int) bool { return types.Default[i].Extension < types.Default[j].Extension })
	sort.Slice(types.Override, func(i, j int) bool { return types.Override[i].PartName < types.Override[j].PartName })
	data, err := xml.Marshal(types)
	if err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	return append([]byte(xml.Header), data...), nil
}
