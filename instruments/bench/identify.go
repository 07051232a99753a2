package bench

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"net/url"
	"path/filepath"
	"strings"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// resolve finds the dialects that are named. The user's own file is looked for
// beside the bench file.
func resolve(slots []slot, benchFile string) error {
	var errs []error
	for n := range slots {
		s := &slots[n]
		if s.from = s.port.Dialect; s.from == "" || s.from == Auto {
			continue
		}
		s.from = ownFile(s.from, benchFile)
		var err error
		if s.d, err = dialect.Find(s.role, s.from); err != nil {
			errs = append(errs, fmt.Errorf("%s: %w", s.name, err))
		}
	}
	return errors.Join(errs...)
}

// ownFile is the path of a user's own dialect file; names are left as they are.
func ownFile(name, benchFile string) string {
	if !strings.HasSuffix(name, ".toml") || filepath.IsAbs(name) {
		return name
	}
	path := filepath.Join(filepath.Dir(benchFile), name)
	if abs, err := filepath.Abs(path); err == nil {
		return abs
	}
	return path
}

// openOne opens one instrument: link, identity, dialect, driver. What was
// opened is closed again when a later step fails.
func openOne(ctx context.Context, s slot, o Options) (*instrument, error) {
	i := &instrument{slot: s}
	err := i.reach(ctx, o)
	if err == nil {
		i.info.Notes, err = i.make(ctx, i)
	}
	if err == nil {
		return i, nil
	}
	if i.link != nil {
		err = errors.Join(err, i.link.Close())
	}
	return nil, fmt.Errorf("%s at %s: %w", s.name, s.port.Address, err)
}

// reach dials and finds out who is there and how to speak to it.
func (i *instrument) reach(ctx context.Context, o Options) error {
	if err := i.dial(ctx, o); err != nil {
		return err
	}
	id, err := i.conn.Identify(ctx)
	if err != nil {
		return i.unanswered(err)
	}
	if want := i.port.Serial; want != "" && want != id.Serial {
		return fmt.Errorf("%w: %s answers, and the bench file says serial = %q; are two instruments of one kind swapped?", driver.ErrWrong, id, want)
	}
	asked := i.d
	if err := i.recognise(id); err != nil {
		return err
	}
	if i.port.Channel > 1 && !i.d.HasChannels() {
		return fmt.Errorf("%w: channel = %d, and dialect %s knows one channel only; leave the key out, or use a dialect that has channels",
			dialect.ErrCannot, i.port.Channel, i.d.Head.Name)
	}
	if c := i.d.Channel; c != nil && c.Count > 0 && i.port.Channel > c.Count {
		return fmt.Errorf("%w: channel = %d, and dialect %s has channels 1 to %d", dialect.ErrCannot, i.port.Channel, i.d.Head.Name, c.Count)
	}
	if asked == nil && particular(i.d) { // found by identity, and its link has settings of its own
		if err := i.link.Close(); err != nil {
			return err
		}
		if err := i.dial(ctx, o); err != nil {
			return err
		}
	}
	i.connect(id.Raw, o)
	i.info = Info{Name: i.name, Role: string(i.role), Address: i.port.Address.String(), Identity: id,
		Dialect: i.d.Head.Name, Hash: i.d.Hash, From: i.from, Memory: i.d.Unchecked()}
	return nil
}

// identifyWithin is allowed for a first answer of an instrument nothing is known of.
const identifyWithin = 3 * time.Second

// dial opens the link as the dialect wants it, as far as one is known.
func (i *instrument) dial(ctx context.Context, o Options) (err error) {
	addr, opt := i.port.Address, link.Options{Dial: o.Dial, Trace: o.Trace, Timeout: identifyWithin}
	if i.d != nil {
		if addr, err = withLine(addr, i.d.Link.Line); err != nil {
			return err
		}
		opt.Terminator, opt.ReplyEnd, opt.ClearBytes = i.d.Link.Terminator, i.d.Link.ReplyEnd, i.d.Link.ClearBytes
		opt.ClearBreak, opt.ClearReply = i.d.Link.Clear == "break", i.d.Link.ClearReply
		if i.d.Link.Timeout > 0 {
			opt.Timeout = i.d.Link.Timeout
		}
	}
	l, err := link.Open(ctx, addr, opt)
	if err != nil {
		return err
	}
	i.link = l
	i.connect("", o)
	return nil
}

// connect makes the connection over the link, expecting an identity if one is known.
func (i *instrument) connect(identity string, o Options) {
	opt := scpi.Options{}
	if i.d != nil {
		opt = driver.Settings(i.d)
	}
	opt.Identity = identity
	if o.Exchange != nil {
		name := i.name
		opt.OnExchange = func(e scpi.Exchange) { o.Exchange(name, e) }
	}
	i.conn = scpi.New(i.link, opt)
}

// particular tells whether a dialect's link differs from the default one.
func particular(d *dialect.Dialect) bool {
	return d.Link.Terminator != "" || d.Link.ReplyEnd != 0 || d.Link.Line != "" || len(d.Link.ClearBytes) > 0 || d.Link.Clear == "break"
}

// withLine adds a dialect's serial settings where the address gives none.
func withLine(a link.Address, line string) (link.Address, error) {
	if a.Scheme != "serial" || line == "" {
		return a, nil
	}
	text, query, _ := strings.Cut(a.String(), "?")
	given, err := url.ParseQuery(query)
	if err != nil {
		return a, err
	}
	usual, err := url.ParseQuery(line)
	if err != nil {
		return a, err
	}
	for key, value := range usual {
		if !given.Has(key) {
			given[key] = value
		}
	}
	return link.Parse(text + "?" + given.Encode())
}

// recognise holds an identity against the dialect that was named, or finds the
// dialect by it. Another kind of instrument than the bench file says is refused.
func (i *instrument) recognise(id instruments.Identity) error {
	all, err := dialect.All()
	if err != nil {
		return err
	}
	if i.d != nil && i.d.Matches(id) {
		return nil
	}
	known, found := dialect.Match(all, id)
	switch {
	case found && known.Head.Role != i.role:
		return fmt.Errorf("%w: the bench file has the %s here, but %s answers, which is a %s; are two addresses swapped?",
			driver.ErrWrong, i.name, id, known.Head.Role)
	case i.d != nil && i.d.Head.AcceptsAny:
		return nil
	case i.d != nil:
		return fmt.Errorf("%w: %s answers, and dialect %s is for %s; correct the address, or set dialect = %q",
			driver.ErrWrong, id, i.d.Head.Name, patterns(i.d), Auto)
	case found:
		i.d, i.from = known, cmp.Or(known.Path, known.Head.Name)
		return nil
	}
	return fmt.Errorf("%w for %s; if it keeps to the usual SCPI nodes set dialect to %s, else write a dialect file for it",
		dialect.ErrUnknown, id, strings.Join(dialect.Names(i.role), " or "))
}

func patterns(d *dialect.Dialect) string {
	var words []string
	for _, p := range d.Identities {
		words = append(words, strings.TrimSpace(p.Maker+" "+p.Model+p.Text))
	}
	return strings.Join(words, ", ")
}

// unanswered says what to try when nobody says who they are.
func (i *instrument) unanswered(err error) error {
	if !errors.Is(err, link.ErrTimeout) {
		return err
	}
	hint := "; if it is of a family whose replies end otherwise than in NL, name its dialect"
	if i.d != nil {
		hint = usual(i.d.Link)
	}
	return fmt.Errorf("no answer to *IDN?: %w; is it on, the address the right one, baud rate, parity and flow control as set at the instrument?%s", err, hint)
}

// usual is how a family is reached when nobody changed its settings, in words for a message.
func usual(l dialect.Link) string {
	var words []string
	if l.Line != "" {
		words = append(words, "serial "+l.Line)
	}
	if l.Port != 0 {
		words = append(words, fmt.Sprintf("TCP port %d", l.Port))
	}
	if len(words) == 0 {
		return ""
	}
	return " usual for this dialect: " + strings.Join(words, ", ")
}
