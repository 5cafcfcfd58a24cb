// Package layout sets text for a terminal of 100 columns.
package layout

import (
	"fmt"
	"strings"
	"unicode/utf8"
)

// Width is the number of columns that text is laid out for.
const Width = 100

// Table writes rows, indented by two, with the first column left and the others
// right aligned; rows too long for the terminal put their first column on a line
// of its own.
func Table(b *strings.Builder, rows [][]string) {
	var widths []int
	for _, row := range rows {
		for c, cell := range row {
			if c == len(widths) {
				widths = append(widths, 0)
			}
			widths[c] = max(widths[c], utf8.RuneCountInString(cell))
		}
	}
	total := 0
	for _, w := range widths {
		total += w + 2
	}
	for _, row := range rows {
		line := "  " + row[0]
		if total > Width && len(row) > 1 {
			if row[0] != "" {
				b.WriteString(line + "\n")
			}
			line = "     "
		} else {
			line += padding(row[0], widths[0])
		}
		for c, cell := range row[1:] {
			line += "  " + padding(cell, widths[c+1]) + cell
		}
		b.WriteString(strings.TrimRight(line, " ") + "\n")
	}
}

func padding(cell string, width int) string {
	return strings.Repeat(" ", width-utf8.RuneCountInString(cell))
}

// Wrap writes s on as many lines as it takes, broken at spaces: the first begins
// with head, the others with as many spaces and hang more.
func Wrap(b *strings.Builder, head string, hang int, s string) {
	line := head
	indent := strings.Repeat(" ", utf8.RuneCountInString(head)+hang)
	for i, word := range strings.Fields(s) {
		switch {
		case i == 0:
		case utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > Width:
			b.WriteString(line + "\n")
			line = indent
		default:
			line += " "
		}
		line += word
	}
	b.WriteString(line + "\n")
}

// Bytes writes a size with two or three digits: "512 B", "3.4 MB", "12 GB".
func Bytes(n int64) string {
	x, units := float64(n), []string{"B", "kB", "MB", "GB", "TB"}
	u := 0
	for ; x >= 999.5 && u < len(units)-1; u++ {
		x /= 1000
	}
	if u == 0 || x >= 9.95 {
		return fmt.Sprintf("%.0f %s", x, units[u])
	}
	return fmt.Sprintf("%.1f %s", x, units[u])
}

// Seconds writes a duration with three digits: "0.4 ms", "4.17 s".
func Seconds(s float64) string {
	if s < 1 {
		return fmt.Sprintf("%.3g ms", s*1000)
	}
	return fmt.Sprintf("%.3g s", s)
}
