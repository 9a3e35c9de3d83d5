package sheet

import (
	"archive/zip"
	"bytes"
	"errors"
	"fmt"
	"hash/crc32"
	"io"
	"path"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

// LargestFile is the most bytes that a workbook may have.
const LargestFile = 64 << 20

// Bounds on what a workbook holds; the largest report comes near none of them.
const (
	mostParts   = 2000
	largestPart = 64 << 20  // bytes, unzipped
	largestAll  = 128 << 20 // bytes of all parts, unzipped
	longestName = 255       // bytes of a part's name
)

const (
	takeAnother = "take another copy, or open it in a spreadsheet program and save it anew as .xlsx"
	saveAnew    = "save the sheet alone as a new .xlsx workbook"
)

// refuse is a fault of the workbook as a whole.
func refuse(fix, format string, args ...any) error {
	return casefile.Error{Fault: pva.Fault{Want: fmt.Sprintf(format, args...), Fix: fix}}
}

// refuseCell is a fault of one cell.
func refuseCell(sheet, ref, fix, format string, args ...any) error {
	return casefile.Error{Cell: sheet + "!" + ref, Fault: pva.Fault{Want: fmt.Sprintf(format, args...), Fix: fix}}
}

// archive is a zip whose parts have all been unzipped once and agree with their
// checksums.
type archive struct {
	parts map[string]*zip.File
}

// open checks the file as an archive.
func open(data []byte) (*archive, error) {
	switch {
	case len(data) > LargestFile:
		return nil, refuse(saveAnew, "is larger than %d MB", LargestFile>>20)
	case bytes.HasPrefix(data, []byte("\xd0\xcf\x11\xe0")):
		return nil, refuse("save it as .xlsx, without a password", "is protected by a password or in an older form of workbook")
	case !bytes.HasPrefix(data, []byte("PK\x03\x04")):
		return nil, refuse("give an .xlsx workbook, or a case file that ends in .toml", "is not a workbook")
	}
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		return nil, refuse(takeAnother, "is a damaged workbook (%s)", zipWords(err))
	}
	if len(z.File) > mostParts {
		return nil, refuse(saveAnew, "holds %d parts, more than the %d that can be read", len(z.File), mostParts)
	}
	a := &archive{parts: make(map[string]*zip.File, len(z.File))}
	seen := make(map[string]bool, len(z.File))
	var all uint64
	for _, e := range z.File {
		if why := badName(e.Name); why != "" {
			return nil, refuse(takeAnother, "holds a part with %s: %.60q", why, e.Name)
		}
		// Names of parts differ by more than case.
		lower := strings.ToLower(strings.TrimSuffix(e.Name, "/"))
		if seen[lower] {
			return nil, refuse(takeAnother, "holds the part %s twice", e.Name)
		}
		seen[lower] = true
		if e.Flags&1 != 0 {
			return nil, refuse("save it without a password", "is protected by a password")
		}
		if e.Method != zip.Store && e.Method != zip.Deflate {
			return nil, refuse(takeAnother, "holds a part packed in an unknown way: %s", e.Name)
		}
		if e.UncompressedSize64 > largestPart {
			return nil, refuse(saveAnew, "holds a part that unzips to more than %d MB: %s", largestPart>>20, e.Name)
		}
		if all += e.UncompressedSize64; all > largestAll {
			return nil, refuse(saveAnew, "unzips to more than %d MB", largestAll>>20)
		}
		a.parts[e.Name] = e
	}
	for _, e := range z.File {
		if err := verify(e); err != nil {
			return nil, refuse(takeAnother, "is damaged: the part %s %s", e.Name, err)
		}
	}
	return a, nil
}

// badName says what is wrong with the name of a part; "" if nothing.
func badName(name string) string {
	clean := strings.TrimSuffix(name, "/")
	switch {
	case name == "" || len(name) > longestName:
		return "an empty or overlong name"
	case strings.ContainsAny(name, "\\:") || strings.HasPrefix(name, "/") || path.Clean(clean) != clean || clean == ".." || strings.HasPrefix(clean, "../"):
		return "a name that leads out of the workbook"
	case strings.IndexFunc(name, func(r rune) bool { return r < 0x20 || r > 0x7e }) >= 0:
		return "a name of strange characters"
	}
	return ""
}

// verify unzips a part without keeping it. The checksum is compared here,
// because the library takes one of zero for none.
func verify(e *zip.File) error {
	if strings.HasSuffix(e.Name, "/") {
		if e.UncompressedSize64 != 0 {
			return errors.New("is a folder that holds data")
		}
		return nil
	}
	r, err := e.Open()
	if err != nil {
		return errors.New(zipWords(err))
	}
	defer r.Close()
	sum := crc32.NewIEEE()
	n, err := io.Copy(sum, io.LimitReader(r, largestPart+1))
	switch {
	case errors.Is(err, zip.ErrChecksum) || err == nil && sum.Sum32() != e.CRC32:
		return errors.New("fails its checksum")
	case err != nil:
		return errors.New("cannot be unzipped: " + zipWords(err))
	case uint64(n) != e.UncompressedSize64:
		return errors.New("is not as long as it says")
	}
	return nil
}

// read opens a part that is to be parsed; most is the most bytes it may have.
func (a *archive) read(name string, most int) (io.ReadCloser, error) {
	e := a.parts[name]
	if e == nil {
		return nil, refuse(takeAnother, "is damaged: the part %s is missing", name)
	}
	if e.UncompressedSize64 > uint64(most) {
		return nil, refuse(saveAnew, "holds a part that unzips to more than %d MB: %s", most>>20, name)
	}
	r, err := e.Open()
	if err != nil {
		return nil, refuse(takeAnother, "is damaged: the part %s %s", name, zipWords(err))
	}
	return r, nil
}

// zipWords says in plain words what the zip reader found.
func zipWords(err error) string {
	switch {
	case errors.Is(err, zip.ErrFormat):
		return "its list of parts cannot be read"
	case errors.Is(err, zip.ErrAlgorithm):
		return "it is packed in an unknown way"
	case errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, io.EOF):
		return "it ends too early"
	}
	return "its packing is broken"
}
