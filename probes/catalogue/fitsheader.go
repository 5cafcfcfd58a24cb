package catalogue

import (
	"errors"
	"io"
	"math"
	"math/bits"
	"strconv"
	"strings"
)

// FITS headers are read here and not with a library, because a header must be
// checked against the size of the file before anything is allocated for what it
// announces.

const (
	fitsBlock  = 2880
	cardLength = 80
	maxBlocks  = 1000 // of one header: 36000 cards
)

// fitsHeader holds the keywords of one header with the values as written,
// strings without their quotation marks. A keyword given twice has its last
// value.
type fitsHeader map[string]string

// readFITSHeader reads one header up to its END card; io.EOF when there is
// none at all.
func readFITSHeader(r io.Reader) (fitsHeader, error) {
	h := fitsHeader{}
	block := make([]byte, fitsBlock)
	last := ""
	for n := range maxBlocks {
		if _, err := io.ReadFull(r, block); err != nil {
			if n == 0 && err == io.EOF {
				return nil, io.EOF
			}
			if err == io.EOF || err == io.ErrUnexpectedEOF {
				return nil, problem("the file ends inside a FITS header; it is cut short or damaged")
			}
			return nil, err
		}
		for i := 0; i < fitsBlock; i += cardLength {
			card := string(block[i : i+cardLength])
			name := strings.TrimRight(card[:8], " ")
			switch {
			case name == "END":
				return h, nil
			case name == "CONTINUE" && strings.HasSuffix(h[last], "&"):
				if more, quoted := cardValue(card[8:]); quoted {
					h[last] = strings.TrimSuffix(h[last], "&") + more
				}
			case card[8:10] == "= ":
				h[name], _ = cardValue(card[10:])
				last = name
			default:
				last = ""
			}
		}
	}
	return nil, problem("a FITS header without an end")
}

// cardValue returns the value in the text of a card, without its comment.
func cardValue(text string) (value string, quoted bool) {
	text = strings.TrimLeft(text, " ")
	if !strings.HasPrefix(text, "'") {
		value, _, _ = strings.Cut(text, "/")
		return strings.TrimSpace(value), false
	}
	var b strings.Builder
	for i := 1; i < len(text); i++ {
		if text[i] == '\'' {
			if i+1 == len(text) || text[i+1] != '\'' {
				break
			}
			i++
		}
		b.WriteByte(text[i])
	}
	return strings.TrimRight(b.String(), " "), true
}

var errNotThere = errors.New("not there")

// integer returns a whole number; errNotThere when the keyword is missing.
func (h fitsHeader) integer(name string) (int64, error) {
	value, ok := h[name]
	if !ok || value == "" {
		return 0, errNotThere
	}
	n, err := strconv.ParseInt(value, 10, 64)
	if err != nil {
		return 0, problem("the FITS keyword %s is %s, where a whole number must be", name, shown(value))
	}
	return n, nil
}

// size returns a whole number that is not negative, missing meaning otherwise.
func (h fitsHeader) size(name string, otherwise int64) (int64, error) {
	n, err := h.integer(name)
	if err == errNotThere {
		if otherwise < 0 {
			return 0, problem("the FITS keyword %s is missing", name)
		}
		return otherwise, nil
	}
	if err == nil && n < 0 {
		return 0, problem("the FITS keyword %s is %d; it cannot be negative", name, n)
	}
	return n, err
}

// real returns a number, missing meaning otherwise.
func (h fitsHeader) real(name string, otherwise float64) (float64, error) {
	value, ok := h[name]
	if !ok || value == "" {
		return otherwise, nil
	}
	x, err := strconv.ParseFloat(strings.NewReplacer("D", "E", "d", "e").Replace(value), 64)
	if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, problem("the FITS keyword %s is %s, where a number must be", name, shown(value))
	}
	return x, nil
}

// dataSize returns the bytes that follow the header, without padding, and the
// lengths of the axes.
func (h fitsHeader) dataSize() (size int64, axes []int64, err error) {
	naxis, err := h.size("NAXIS", -1)
	if err != nil {
		return 0, nil, err
	}
	if naxis > 999 {
		return 0, nil, problem("the FITS keyword NAXIS is %d; it cannot be above 999", naxis)
	}
	bitpix, err := h.integer("BITPIX")
	if err != nil {
		return 0, nil, problem("the FITS keyword BITPIX is missing or not a whole number")
	}
	switch bitpix {
	case 8, 16, 32, 64, -32, -64:
	default:
		return 0, nil, problem("the FITS keyword BITPIX is %d, which the standard does not know", bitpix)
	}
	product := int64(0)
	for i := range naxis {
		n, err := h.size("NAXIS"+strconv.FormatInt(i+1, 10), -1)
		if err != nil {
			return 0, nil, err
		}
		axes = append(axes, n)
		if i == 0 {
			product = n
		} else {
			product = multiply(product, n)
		}
	}
	heap, err := h.size("PCOUNT", 0)
	if err != nil {
		return 0, nil, err
	}
	groups, err := h.size("GCOUNT", 1)
	if err != nil {
		return 0, nil, err
	}
	if product > math.MaxInt64-heap {
		product = math.MaxInt64 - heap
	}
	return multiply(multiply(product+heap, groups), max(bitpix, -bitpix)/8), axes, nil
}

// multiply returns a·b of two numbers that are not negative, at most the
// largest int64.
func multiply(a, b int64) int64 {
	high, low := bits.Mul64(uint64(a), uint64(b))
	if high != 0 || low > math.MaxInt64 {
		return math.MaxInt64
	}
	return int64(low)
}
