package scpi

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"time"

	"nightbench/instruments/link"
)

// An attempt at a proof may fail because nobody answers, or another
// instrument does: that is tried silentTries times. It may fail because old
// replies are still coming: that is progress, and is tried tries times.
const (
	silentTries = 3
	tries       = 12
)

// ready makes sure of being in step before something is asked: bytes nobody
// asked for put it in doubt, and any doubt is settled by a proof.
func (t *talk) ready(ctx context.Context, turn *link.Turn) error {
	if waiting := turn.Waiting(); len(waiting) > 0 {
		t.strays = string(clip(waiting))
		t.doubt()
	}
	if t.doubts.Load() == 0 {
		return nil
	}
	return t.resync(ctx, turn)
}

// resync clears, drains until quiet and proves, several times if need be. A
// socket is opened anew when that does not help; a serial line is not, since
// opening one resets some instruments.
func (t *talk) resync(ctx context.Context, turn *link.Turn) error {
	ctx, cancel := context.WithTimeout(ctx, t.opt.ResyncLimit)
	defer cancel()
	err := t.seekStep(ctx, turn)
	if err == nil || hopeless(ctx, err) || t.link.Address().Scheme == "serial" {
		return err
	}
	if again := turn.Reopen(ctx); again != nil {
		return errors.Join(err, again)
	}
	return t.seekStep(ctx, turn)
}

// hopeless says whether trying again on the same terms is of no use.
func hopeless(ctx context.Context, err error) bool {
	return ctx.Err() != nil || errors.Is(err, link.ErrLost) || errors.Is(err, link.ErrClosed)
}

func (t *talk) seekStep(ctx context.Context, turn *link.Turn) (err error) {
	for n, silent := 0, 0; silent < silentTries && n < tries; n++ {
		before := t.doubts.Load()
		if err = t.prove(ctx, turn); err == nil {
			t.unsure = 0
			if t.doubts.CompareAndSwap(before, 0) {
				return nil
			}
			err = ErrInterrupted // something was sent blind meanwhile: prove again
		}
		if hopeless(ctx, err) {
			break
		}
		if errors.Is(err, link.ErrTimeout) || errors.Is(err, ErrOther) {
			silent++
		}
	}
	return fmt.Errorf("%w: %w", ErrOutOfStep, err)
}

// prove drains, asks who is there, and then asks the marker once more often
// than any proof that failed.
//
// That a late reply can't pass for an answer is seen by counting. Replies come
// in the order of the questions. Each proof sends the identity query first, so
// the questions still unanswered hold at most unsure markers in a row; a run
// of unsure+1 marker replies can therefore only be the run asked here, which
// was asked last: nothing is outstanding behind it. A late marker reply to a
// question before all proofs comes before an identity, and so is found out by
// the first comparison.
func (t *talk) prove(ctx context.Context, turn *link.Turn) error {
	if _, err := turn.Clear(ctx); err != nil {
		return err
	}
	who, err := t.ask(ctx, turn, t.opt.IdentityQuery)
	if err != nil {
		return err
	}
	if err := t.recognise(who); err != nil {
		return err
	}
	marker := t.opt.Marker
	if t.opt.NoMarker {
		marker = Marker{Query: t.opt.IdentityQuery, Replies: []string{who}}
	}
	for n := range t.unsure + 1 {
		t.unsure = max(t.unsure, n+1)
		got, err := t.ask(ctx, turn, marker.Query)
		if err != nil {
			return err
		}
		if !slices.Contains(marker.Replies, got) {
			return fmt.Errorf("%s answered %q instead of %q", marker.Query, got, marker.Replies[0])
		}
	}
	if err := t.silent(ctx, turn); err != nil {
		return err
	}
	t.identity = who
	return nil
}

// recognise compares the answer with the identity remembered. A first answer
// must at least not pass for a number or marker.
func (t *talk) recognise(who string) error {
	switch {
	case who == t.identity:
		return nil
	case slices.Contains(t.opt.Marker.Replies, who), !strings.ContainsFunc(who, isLetter), !printable(who):
		return fmt.Errorf("%s answered %q, which is no identity; are baud rate, parity and stop bits right?", t.opt.IdentityQuery, who)
	case t.identity != "":
		return fmt.Errorf("%w: %q instead of %q", ErrOther, who, t.identity)
	}
	return nil
}

// settle is how long an instrument without a marker must be silent after the
// proof; with a marker the counting suffices and only what is there counts.
const settle = 100 * time.Millisecond

func (t *talk) silent(ctx context.Context, turn *link.Turn) (err error) {
	more := turn.Waiting()
	if t.opt.NoMarker {
		more, err = turn.Listen(ctx, settle)
	}
	if err == nil && len(more) > 0 {
		err = fmt.Errorf("%w: after the proof %q came", ErrFraming, clip(more))
	}
	return err
}

// ask is one exchange of a proof.
func (t *talk) ask(ctx context.Context, turn *link.Turn, query string) (string, error) {
	if err := t.wait(ctx); err != nil {
		return "", err
	}
	e := Exchange{Start: t.opt.Now(), Command: query, Proof: true, Strays: t.strays}
	if e.Err = turn.Send(ctx, query); e.Err == nil {
		e.Err = t.echo(ctx, turn, query)
	}
	if e.Err == nil {
		e.Reply, e.Err = turn.ReadLine(ctx)
	}
	t.end(e)
	return bare(query, e.Reply), e.Err
}

// bare drops a response header, which some instruments send until they are
// told not to: *OPC 1 for *OPC? (Siglent SDS1104X-E Programming Guide p. 84).
// Then the same instrument is recognised with headers on and off.
func bare(query, reply string) string {
	header, ok := strings.CutSuffix(query, "?")
	if rest, found := strings.CutPrefix(reply, header+" "); ok && found {
		return strings.TrimSpace(rest)
	}
	return reply
}

func isLetter(r rune) bool { return r >= 'A' && r <= 'Z' || r >= 'a' && r <= 'z' }

// printable says whether text is plain ASCII without control characters.
func printable(text string) bool {
	return text != "" && !strings.ContainsFunc(text, func(r rune) bool { return r < ' ' || r > '~' })
}
