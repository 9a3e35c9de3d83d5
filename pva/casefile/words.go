package casefile

import "strings"

// syntaxWords says a syntax fault in words of a reader who has never heard of a
// parser. The parser is pinned to one version; what it says beyond this list is
// passed on as it is.
func syntaxWords(message string) string {
	m := strings.TrimPrefix(message, "toml: ")
	for _, w := range [][2]string{
		{"strings must be quoted", "a text needs quotes"},
		{"expected newline but got U+002C", "a number has a decimal point, not a comma"},
		{"expected newline", "more stands on the line than one key and its value"},
		{"unexpected character U+000A", "a value is missing after the ="},
		{"unexpected character U+000D", "a value is missing after the ="},
		{"unexpected character U+002E", "a decimal point needs a digit on either side: 0.5"},
		{"unexpected character", "this is no value; a text needs quotes"},
		{"expected value, not end of input", "a value is missing after the ="},
		{"decimal point must be followed", "a decimal point needs a digit on either side: 5.0"},
		{"leading zeroes", "a number may not begin with a 0 before another digit"},
		{"cannot have new lines", "a text ends on the line on which it begins: its closing quote is missing"},
		{"array is incomplete", "a list is not closed: its ] is missing"},
		{"after array value", "a list has a comma between two values and ends with ]"},
		{"inline table is incomplete", "a table is not closed: its } is missing"},
		{"after inline table key-value", "a table has a comma between two keys and ends with }"},
		{"to close table name", "the ] that ends the name of a table is missing"},
		{"to close array table name", "the ]] that ends the name of a table is missing"},
		{"expected '=' after key", "a key is followed by = and its value"},
		{"start of key", "a key has only letters, digits, - and _, unless it is in quotes"},
		{"invalid UTF-8", "the file is not UTF-8 text: save it as UTF-8"},
	} {
		if strings.Contains(m, w[0]) {
			return w[1]
		}
	}
	return "this is not TOML: " + m
}

// duplicateWords says what is given twice.
func duplicateWords(message string) string {
	m := strings.TrimPrefix(message, "toml: ")
	for _, known := range []string{"already defined", "already exists", "should be"} {
		if strings.Contains(m, known) {
			return m
		}
	}
	return syntaxWords(m)
}

func duplicateFix(message string) string {
	switch {
	case strings.Contains(message, "as a value"), strings.Contains(message, "should be a table"):
		return "it has been given as a value further up"
	case strings.Contains(message, "already defined"), strings.Contains(message, "already exists"):
		return "a key or table stands only once: keep one of them"
	}
	return ""
}
