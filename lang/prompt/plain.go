package prompt

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"strings"
)

// longest line of piped input
const longestLine = 1 << 20

// plainReader reads lines where there is no terminal.
type plainReader struct{ in *bufio.Reader }

func newPlainReader(in io.Reader) *plainReader {
	return &plainReader{bufio.NewReaderSize(in, 64<<10)}
}

func (r *plainReader) line(string) (string, error) {
	var b strings.Builder
	for {
		part, err := r.in.ReadSlice('\n')
		b.Write(part)
		if b.Len() > longestLine {
			return "", fmt.Errorf("a line is longer than %d bytes", longestLine)
		}
		if errors.Is(err, bufio.ErrBufferFull) {
			continue
		}
		return strings.TrimRight(b.String(), "\r\n"), err
	}
}

func (*plainReader) remember(string) {}
func (*plainReader) close()          {}
