package cache

import (
	"encoding/binary"
	"errors"
	"fmt"
	"hash/fnv"
	"math"
	"os"
)

// bbolt trusts the pages of its file: it follows page numbers, lengths and
// offsets through unsafe pointers, and a changed byte among them can end the
// program beyond any recovery. So the code here reads the pages by itself, checking
// every number against its bounds: once before bbolt may open a database in
// this process, and to save what can be saved of a damaged one.
//
// The layout, in the machine's byte order: a page begins with its number (8
// bytes), kind (2), number of elements (2) and how many pages it goes on for
// (4). The first two pages are metas, of which the newer valid one counts.
// Elements of leaves are flags, position, key length and value length, those of
// branches position, key length (4 each) and page number (8); a position counts
// from its element. The value of a bucket's element is the page number of its
// root (8) and a sequence (8), and with page number 0 a whole leaf follows.

const (
	branchPage = 0x01
	leafPage   = 0x02
	freePage   = 0x10

	pageHeader    = 16
	elementSize   = 16
	bucketHeader  = 16
	bucketElement = 0x01
	noFreeList    = math.MaxUint64

	metaSize    = 64
	metaMagic   = 0xED0CDAED
	metaVersion = 2
)

var native = binary.NativeEndian

// pageFile is the content of a bbolt file.
type pageFile struct {
	data     []byte
	size     int    // of a page
	pages    uint64 // in use
	root     uint64 // page of the bucket of buckets
	freeList uint64
	reached  []bool // pages found in use so far
}

// meta is what counts of a meta page.
type meta struct {
	pageSize uint32
	root     uint64
	freeList uint64
	pages    uint64
	txid     uint64
}

func parseMeta(page []byte) (m meta, ok bool) {
	b := page[pageHeader:]
	sum := fnv.New64a()
	sum.Write(b[:metaSize-8])
	if native.Uint32(b) != metaMagic || native.Uint32(b[4:]) != metaVersion || native.Uint64(b[metaSize-8:]) != sum.Sum64() {
		return m, false
	}
	return meta{native.Uint32(b[8:]), native.Uint64(b[16:]), native.Uint64(b[32:]), native.Uint64(b[40:]), native.Uint64(b[48:])}, true
}

// newPageFile reads the metas of a file. Of a file that carries none it gives
// what lies in it, page after page, with an error.
func newPageFile(data []byte) (*pageFile, error) {
	p := &pageFile{data: data, size: os.Getpagesize()}
	var best meta
	if len(data) >= pageHeader+metaSize {
		if m, ok := parseMeta(data); ok && m.pageSize >= 512 && m.pageSize <= 1<<20 {
			best, p.size = m, int(m.pageSize)
		}
	}
	if len(data) >= p.size+pageHeader+metaSize {
		if m, ok := parseMeta(data[p.size:]); ok && int(m.pageSize) == p.size && m.txid >= best.txid {
			best = m
		}
	}
	var err error
	p.root, p.freeList, p.pages = best.root, best.freeList, uint64(len(data)/p.size)
	switch {
	case best.pageSize == 0:
		err = errors.New("its first pages are damaged")
	case best.pages > p.pages:
		err = fmt.Errorf("it is cut short: %d bytes are there of %d", len(data), best.pages*uint64(p.size))
	default:
		p.pages = best.pages
	}
	p.reached = make([]bool, p.pages)
	return p, err
}

// node is a branch or a leaf.
type node struct {
	id       uint64
	kind     uint16
	elements []element
}

type element struct {
	flags      uint32
	key, value []byte
	child      uint64 // page of a branch's element
}

// read gives a page and those it goes on for, without believing its elements.
func (p *pageFile) read(id uint64) ([]byte, error) {
	page := p.data[id*uint64(p.size):]
	more := uint64(native.Uint32(page[12:]))
	if native.Uint64(page) != id {
		return nil, fmt.Errorf("page %d carries another number", id)
	}
	if id+more >= p.pages {
		return nil, fmt.Errorf("page %d reaches beyond the end", id)
	}
	return page[:(more+1)*uint64(p.size)], nil
}

// parse reads the elements of a page. Those out of bounds are left out and make
// an error.
func parse(page []byte) (n node, err error) {
	n = node{id: native.Uint64(page), kind: native.Uint16(page[8:])}
	count := int(native.Uint16(page[10:]))
	if n.kind != leafPage && n.kind != branchPage {
		return n, fmt.Errorf("page %d is neither a leaf nor a branch", n.id)
	}
	if end := pageHeader + count*elementSize; end > len(page) {
		return n, fmt.Errorf("page %d has more elements than fit", n.id)
	}
	for i := range count {
		at := pageHeader + i*elementSize
		word := func(k int) uint64 { return uint64(native.Uint32(page[at+4*k:])) }
		var e element
		var start, keyEnd, end uint64
		if n.kind == leafPage {
			e.flags = uint32(word(0))
			start = uint64(at) + word(1)
			keyEnd = start + word(2)
			end = keyEnd + word(3)
		} else {
			e.child = native.Uint64(page[at+8:])
			start = uint64(at) + word(0)
			keyEnd = start + word(1)
			end = keyEnd
		}
		if start < uint64(pageHeader+count*elementSize) || end > uint64(len(page)) {
			err = fmt.Errorf("page %d has an element outside it", n.id)
			continue
		}
		e.key, e.value = page[start:keyEnd], page[keyEnd:end]
		n.elements = append(n.elements, e)
	}
	return n, err
}

// entries visits every element that looks like an entry of a bucket, whatever
// else is wrong with the file, either on the pages that belong to the tree or on
// all others.
func (p *pageFile) entries(live bool, visit func(key, value []byte) error) error {
	p.reached = make([]bool, p.pages)
	p.follow(p.root, 0)
	for id := uint64(2); id < p.pages; id++ {
		if p.reached[id] != live {
			continue
		}
		page, err := p.read(id)
		if err != nil || native.Uint16(page[8:]) != leafPage {
			continue
		}
		n, _ := parse(page) // without its damaged elements
		for _, e := range n.elements {
			leaf := node{elements: []element{e}}
			if e.flags == bucketElement {
				leaf, _ = inline(e)
			}
			for _, e := range leaf.elements {
				if e.flags == bucketElement { // on a page of the tree of buckets
					continue
				}
				if err := visit(e.key, e.value); err != nil {
					return err
				}
			}
		}
	}
	return nil
}

// follow marks what can be reached of a tree with damage in it.
func (p *pageFile) follow(id uint64, depth int) {
	if id < 2 || id >= p.pages || depth > maxDepth || p.reached[id] {
		return
	}
	page, err := p.read(id)
	if err != nil {
		return
	}
	p.reached[id] = true
	n, _ := parse(page)
	for _, e := range n.elements {
		switch {
		case n.kind == branchPage:
			p.follow(e.child, depth+1)
		case e.flags == bucketElement && len(e.value) >= bucketHeader:
			p.follow(native.Uint64(e.value), depth+1)
		}
	}
}
