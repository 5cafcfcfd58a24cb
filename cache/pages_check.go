package cache

import (
	"bytes"
	"fmt"
)

// check verifies that bbolt can be trusted with the file: all pages that can be
// reached form trees of buckets in the order of their keys, and no free page is
// among them.
func (p *pageFile) check() error {
	err := p.walk(p.root, nil, nil, 0, func(e element) error {
		if e.flags != bucketElement || len(e.value) < bucketHeader {
			return fmt.Errorf("the list of buckets is damaged")
		}
		if root := native.Uint64(e.value); root != 0 {
			return p.walk(root, nil, nil, 0, plain)
		}
		n, err := inline(e)
		if err != nil {
			return err
		}
		if err := n.ordered(nil, nil); err != nil {
			return err
		}
		return n.each(plain)
	})
	if err != nil {
		return err
	}
	return p.checkFree()
}

// plain accepts an element that is not a bucket.
func plain(e element) error {
	if e.flags != 0 {
		return fmt.Errorf("an entry has unknown flags")
	}
	return nil
}

// inline is the leaf within the element of a small bucket.
func inline(e element) (node, error) {
	if len(e.value) < bucketHeader+pageHeader {
		return node{}, fmt.Errorf("the bucket %q is cut short", e.key)
	}
	n, err := parse(e.value[bucketHeader:])
	if err == nil && n.kind != leafPage {
		err = fmt.Errorf("the bucket %q holds no leaf", e.key)
	}
	return n, err
}

// maxDepth is more than a tree in a file of any size needs.
const maxDepth = 64

// walk visits the elements of the leaves of a tree whose keys begin with low and
// end before high, where these are not nil.
func (p *pageFile) walk(id uint64, low, high []byte, depth int, visit func(element) error) error {
	if id < 2 || id >= p.pages || depth > maxDepth {
		return fmt.Errorf("page %d cannot be part of a bucket", id)
	}
	page, err := p.read(id)
	if err != nil {
		return err
	}
	if err := p.reach(id, len(page)/p.size); err != nil {
		return err
	}
	n, err := parse(page)
	if err != nil {
		return err
	}
	if err := n.ordered(low, high); err != nil {
		return err
	}
	if len(n.elements) == 0 && (n.kind == branchPage || depth > 0) {
		return fmt.Errorf("page %d is empty", id)
	}
	if n.kind == leafPage {
		return n.each(visit)
	}
	for i, e := range n.elements {
		next := high
		if i+1 < len(n.elements) {
			next = n.elements[i+1].key
		}
		if err := p.walk(e.child, e.key, next, depth+1, visit); err != nil {
			return err
		}
	}
	return nil
}

// reach marks pages as in use, each once.
func (p *pageFile) reach(id uint64, count int) error {
	for i := range uint64(count) {
		if p.reached[id+i] {
			return fmt.Errorf("page %d is used twice", id+i)
		}
		p.reached[id+i] = true
	}
	return nil
}

// ordered makes sure that keys ascend, beginning with low, which is how bbolt
// finds a node in its parent, and ending before high.
func (n *node) ordered(low, high []byte) error {
	for i, e := range n.elements {
		if i == 0 && low != nil && !bytes.Equal(e.key, low) ||
			i > 0 && bytes.Compare(n.elements[i-1].key, e.key) >= 0 ||
			high != nil && bytes.Compare(e.key, high) >= 0 {
			return fmt.Errorf("page %d has keys out of order", n.id)
		}
	}
	return nil
}

func (n *node) each(visit func(element) error) error {
	for _, e := range n.elements {
		if err := visit(e); err != nil {
			return err
		}
	}
	return nil
}

// checkFree makes sure that nothing in use is listed as free.
func (p *pageFile) checkFree() error {
	if p.freeList == noFreeList {
		return nil
	}
	if p.freeList < 2 || p.freeList >= p.pages {
		return fmt.Errorf("its list of free pages is lost")
	}
	page, err := p.read(p.freeList)
	if err != nil {
		return err
	}
	if native.Uint16(page[8:]) != freePage {
		return fmt.Errorf("its list of free pages is damaged")
	}
	if err := p.reach(p.freeList, len(page)/p.size); err != nil {
		return err
	}
	ids := page[pageHeader:]
	count := uint64(native.Uint16(page[10:]))
	if count == 0xffff { // the number did not fit
		count = native.Uint64(ids)
		ids = ids[8:]
	}
	if count > uint64(len(ids)/8) {
		return fmt.Errorf("its list of free pages is damaged")
	}
	for i := range count {
		id := native.Uint64(ids[8*i:])
		if id < 2 || id >= p.pages {
			return fmt.Errorf("its list of free pages is damaged")
		}
		if err := p.reach(id, 1); err != nil {
			return err
		}
	}
	return nil
}
