package casefile

import _ "embed"

//go:embed starter.toml
var starter []byte

// Starter is a commented case to begin from: an invented population in an
// invented place, with every key of a case shown, most of them commented out.
func Starter() []byte { return append([]byte(nil), starter...) }
