package casefile

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"

	"ebbline/pva"

	"github.com/pelletier/go-toml/v2/unstable"
)

// literal writes a value in TOML. A number keeps the digits it came with where
// those are TOML and say the same, so that a 64-bit seed loses nothing.
func literal(v pva.Value) string {
	switch v.Kind {
	case pva.FlagKind:
		return strconv.FormatBool(v.Flag)
	case pva.TextKind:
		return quote(v.Text)
	case pva.ListKind:
		return "[]"
	}
	if n, ok := tomlNumber(v.Text); ok && n == v.Num {
		return v.Text
	}
	s := strconv.FormatFloat(v.Num, 'g', -1, 64)
	return s
}

// tomlNumber reads a text that is one TOML number and nothing else.
func tomlNumber(s string) (float64, bool) {
	if s == "" || len(s) > 400 || strings.Trim(s, "0123456789+-._eExobABCDEFabcdef") != "" {
		return 0, false
	}
	var p unstable.Parser
	p.Reset([]byte("v = " + s))
	if !p.NextExpression() {
		return 0, false
	}
	v := p.Expression().Value()
	if (v.Kind != unstable.Integer && v.Kind != unstable.Float) || len(v.Data) != len(s) {
		return 0, false
	}
	return parseNumber(s)
}

// quote writes a text as a TOML basic string.
func quote(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r == '\n':
			b.WriteString(`\n`)
		case r == '\t':
			b.WriteString(`\t`)
		case unicode.IsControl(r):
			fmt.Fprintf(&b, `\u%04X`, r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// bareKey writes a key, in quotes where it needs them.
func bareKey(s string) string {
	for _, r := range s {
		if !(r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == '-' || r == '_') {
			return quote(s)
		}
	}
	if s == "" {
		return `""`
	}
	return s
}
