package reports

import (
	"archive/zip"
	"crypto/sha256"
	"encoding/hex"
	"encoding/xml"
	"io"
	"os"
)

// The document properties by which a report workbook is known again.
const (
	PropertyProgram = "Program"
	PropertyVersion = "Version"
	PropertyTitle   = "Title digest" // TitleMark of the report's title
	PropertyCase    = "Case digest"
)

// TitleMark stands for a title in the properties of a report, whatever its
// length and letters.
func TitleMark(title string) string {
	sum := sha256.Sum256([]byte(title))
	return hex.EncodeToString(sum[:16])
}

// Bounds on what is read of a file that only claims to be a report.
const (
	largestReport   = 256 << 20 // bytes
	mostEntries     = 2000
	largestProperty = 64 << 10
)

// Owned says whether the file at path is a report workbook as this program
// wrote it, and whether it reports the case of the title given. A workbook that
// another program has saved since is not ours any more, so that nobody's remarks
// are overwritten unasked. Only the properties are read, within bounds; a file
// that is no workbook at all is not ours and no error. The error of a file that
// does not exist satisfies errors.Is(err, fs.ErrNotExist).
func Owned(path, title string) (ours, sameCase bool, err error) {
	f, err := os.Open(path)
	if err != nil {
		return false, false, err
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return false, false, err
	}
	if !info.Mode().IsRegular() || info.Size() > largestReport {
		return false, false, nil
	}
	z, err := zip.NewReader(f, info.Size())
	if err != nil || len(z.File) > mostEntries {
		return false, false, nil
	}
	var app struct {
		Application string `xml:"Application"`
	}
	var custom struct {
		Property []struct {
			Name string `xml:"name,attr"`
			Text string `xml:"lpwstr"`
		} `xml:"property"`
	}
	if !readPart(z, "docProps/app.xml", &app) || !readPart(z, "docProps/custom.xml", &custom) || app.Application != Program {
		return false, false, nil
	}
	has := map[string]string{}
	for _, p := range custom.Property {
		has[p.Name] = p.Text
	}
	ours = has[PropertyProgram] == Program
	return ours, ours && has[PropertyTitle] == TitleMark(title), nil
}

// readPart decodes one small part of a zip, false if it is absent, too large or broken.
func readPart(z *zip.Reader, name string, into any) bool {
	for _, e := range z.File {
		if e.Name != name {
			continue
		}
		if e.UncompressedSize64 > largestProperty {
			return false
		}
		r, err := e.Open()
		if err != nil {
			return false
		}
		defer r.Close()
		data, err := io.ReadAll(io.LimitReader(r, largestProperty+1))
		return err == nil && len(data) <= largestProperty && xml.Unmarshal(data, into) == nil
	}
	return false
}
