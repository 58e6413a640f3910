// Package stdlib embeds the part of the vocabulary that is written in the language itself.
package stdlib

import "embed"

// Files holds the *.gain files of definitions.
//
//go:embed *.gain
var Files embed.FS
