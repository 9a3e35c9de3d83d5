package casefile

import (
	"errors"
	"fmt"
	"strings"
	"unicode/utf8"

	"ebbline/pva"

	"github.com/pelletier/go-toml/v2/unstable"
)

// longestSetting is the most bytes that one override may have.
const longestSetting = 1 << 20

// ParseSetting reads "key=value" as given with --set: the key by name or
// position, the value as in a case file. Words need no quotes. A list gives one
// setting for the list and one for each element; a table one for each key.
func ParseSetting(text string) ([]pva.Setting, error) {
	refuse := func(format string, args ...any) ([]pva.Setting, error) {
		shown := text
		if len(shown) > 80 {
			shown = shown[:80] + "…"
		}
		return nil, fmt.Errorf("--set %s: "+format, append([]any{printable(shown)}, args...)...)
	}
	key, value, ok := strings.Cut(text, "=")
	key, value = strings.TrimSpace(key), strings.TrimSpace(value)
	switch {
	case !ok:
		return refuse("has no value; write key=value, such as harvest.1.take=4")
	case key == "":
		return refuse("has no key; write key=value, such as harvest.1.take=4")
	case len(text) > longestSetting:
		return refuse("is too long")
	case !utf8.ValidString(text):
		return refuse("is not UTF-8 text")
	}
	n := nodeAt(key)
	if n == nil || n == schema {
		return refuse("%s", unknownNamed(key).Error())
	}
	if value == "" {
		return refuse("has no value; give %s", shapeAsks(n, key))
	}
	if n.key != nil && !n.number && !strings.HasPrefix(value, `"`) && !strings.HasPrefix(value, "'") {
		if flag := value == "true" || value == "false"; !flag || len(n.key.Choices) > 0 {
			return []pva.Setting{{Path: key, Value: pva.Text(value)}}, nil
		}
	}
	entries, err := parseValue(n, key, value)
	if err != nil {
		return refuse("%s", err)
	}
	if len(entries) == 0 {
		return refuse("sets nothing; give %s", shapeAsks(n, key))
	}
	settings := make([]pva.Setting, len(entries))
	for i, e := range entries {
		settings[i] = pva.Setting{Path: e.Path, Value: e.Value}
	}
	return settings, nil
}

// parseValue reads one TOML value for a key.
func parseValue(n *node, key, value string) ([]pva.Entry, error) {
	const prefix = "v = "
	r := newReader("--set", []byte(prefix+value))
	if n.key != nil && n.number && !strings.HasPrefix(value, "{") && !strings.HasPrefix(value, "[") {
		// A number is said to be none, whatever else it might be.
		var p unstable.Parser
		p.Reset(r.data)
		if !p.NextExpression() || p.NextExpression() || p.Error() != nil {
			return nil, pva.Fault{Key: key, Value: fmt.Sprintf("%q", value), Want: "is not a number", Fix: "give " + n.key.Asks()}
		}
	}
	if !r.sane() || !r.syntax() {
		return nil, errors.New(r.faults[0].fault.Error())
	}
	var p unstable.Parser
	p.Reset(r.data)
	for count := 0; p.NextExpression(); count++ {
		e := p.Expression()
		if count > 0 || e.Kind != unstable.KeyValue {
			return nil, errors.New("more than one value is given; quote the whole argument for your shell")
		}
		r.valueAt = len(prefix)
		r.value(n, key, e.Value(), how{named: true})
	}
	r.finish()
	if len(r.sources) > 0 {
		return nil, pva.Fault{Key: key, Want: "takes no source here", Fix: "give the bare value, or write the source into the case"}
	}
	if len(r.faults) > 0 {
		return nil, errors.New(r.faults[0].fault.Error())
	}
	return r.entries, nil
}

// Override is the case with settings of the command line in force. Its errors
// name --set as their place.
func Override(c *pva.Case, settings []pva.Setting) (*pva.Case, Errors) {
	out, faults := c.With(settings)
	if len(faults) == 0 {
		faults = out.CheckOptions()
	}
	if len(faults) == 0 {
		faults = solvable(out)
	}
	if len(faults) == 0 {
		return out, nil
	}
	errs := make(Errors, len(faults))
	for i, f := range faults {
		errs[i] = Error{File: "--set", Fault: f}
	}
	return nil, errs
}

// printable is text of the command line as it may be printed.
func printable(s string) string { return shown(s) }
