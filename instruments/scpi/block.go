package scpi

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"

	"nightbench/instruments/link"
)

// blockQuiet is how long the stream must be quiet after a block, terminators
// apart, to believe its count.
const blockQuiet = 20 * time.Millisecond

// QueryBlock asks for an arbitrary block of definite length and returns its
// bytes. The count is refused above most bytes, before any are taken. After
// the bytes may come NL, CR NL, two NL or nothing; anything else means that
// the count was wrong, and the block is not used.
func (c *Conn) QueryBlock(ctx context.Context, query string, most int) (block []byte, err error) {
	return c.QueryBlockAs(ctx, query, BlockForm{Leads: leads(c.opt.BlockLead)}, most)
}

// BlockForm says what stands around a block.
type BlockForm struct {
	Leads []string // texts of which one may stand before the #
	Tail  string   // what has to come after the bytes: "\n", "\n\n"; empty: terminators or nothing
}

func leads(lead string) []string {
	if lead == "" {
		return nil
	}
	return []string{lead}
}

// QueryBlockAs is QueryBlock for a block in a form of its own.
func (c *Conn) QueryBlockAs(ctx context.Context, query string, form BlockForm, most int) (block []byte, err error) {
	if err := checkMessage(query, true); err != nil {
		return nil, err
	}
	if c.link.Address().Line.Flow == "xonxoff" {
		return nil, c.wrap(query, fmt.Errorf("%w: on a line with flow=xonxoff two values of a byte never arrive; use flow=rtscts or none", ErrMessage))
	}
	err = c.exchange(ctx, query, func(t *link.Turn) (string, error) {
		block, err = c.readBlock(ctx, t, form, most)
		return fmt.Sprintf("block of %d bytes", len(block)), err
	})
	if err != nil {
		return nil, err
	}
	return block, nil
}

func (t *talk) readBlock(ctx context.Context, turn *link.Turn, form BlockForm, most int) ([]byte, error) {
	count, err := t.readCount(ctx, turn, form.Leads)
	switch {
	case err != nil:
		return nil, err
	case count > most:
		return nil, fmt.Errorf("%w: a block of %d bytes is announced, at most %d are expected", ErrFraming, count, most)
	}
	block, err := turn.ReadFull(ctx, count)
	if err != nil {
		return nil, fmt.Errorf("%w: block cut short, got %d of %d bytes: %w", ErrFraming, len(block), count, err)
	}
	if tail, err := turn.ReadFull(ctx, len(form.Tail)); err != nil || string(tail) != form.Tail {
		return block, errors.Join(fmt.Errorf("%w: %q came after the %d bytes announced, and %q has to", ErrFraming, tail, count, form.Tail), err)
	}
	more, err := turn.Listen(ctx, blockQuiet)
	if err == nil && len(more) > 0 {
		err = fmt.Errorf("%w: %q came after the %d bytes announced", ErrFraming, clip(more), count)
	}
	return block, err
}

// readCount reads the head of a block: the lead of this family, #, one digit
// n, and n digits.
func (t *talk) readCount(ctx context.Context, turn *link.Turn, leads []string) (int, error) {
	if err := t.readLead(ctx, turn, leads); err != nil {
		return 0, err
	}
	n, err := turn.ReadFull(ctx, 1)
	switch {
	case err != nil:
		return 0, err
	case n[0] == '0':
		return 0, ErrIndefinite
	case n[0] < '1' || n[0] > '9':
		return 0, fmt.Errorf("%w: #%q begins no block", ErrFraming, n)
	}
	digits, err := turn.ReadFull(ctx, int(n[0]-'0'))
	if err != nil {
		return 0, err
	}
	count, err := strconv.ParseUint(string(digits), 10, 31)
	if err != nil {
		return 0, fmt.Errorf("%w: the count of the block is %q", ErrFraming, digits)
	}
	return int(count), nil
}

// readLead reads up to the first #. Terminators left by the reply before may
// stand at the very start.
func (t *talk) readLead(ctx context.Context, turn *link.Turn, leads []string) error {
	lead := []byte{}
	for {
		if len(lead) == 0 {
			turn.Waiting() // drops blanks
		}
		b, err := turn.ReadFull(ctx, 1)
		switch {
		case err != nil:
			return err
		case b[0] == '#' && (len(lead) == 0 || slices.Contains(leads, string(lead))):
			return nil
		case len(lead) == 0 && (b[0] == '\n' || b[0] == '\r'):
			continue
		}
		lead = append(lead, b[0])
		if !slices.ContainsFunc(leads, func(l string) bool { return strings.HasPrefix(l, string(lead)) }) {
			return fmt.Errorf("%w: a block must begin with %q, %q came", ErrFraming, strings.Join(append(slices.Clone(leads), ""), "# or ")+"#", lead)
		}
	}
}
