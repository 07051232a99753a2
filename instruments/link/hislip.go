package link

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"net"
	"sync"
	"time"
)

// hislip is an instrument that speaks HiSLIP 1.0 (IVI-6.1) in synchronous
// mode: two connections, one for messages and one beside it for the device
// clear and the lock. Every message has a number, and a reply carries the
// number of its question; replies to earlier questions are dropped here.
//
// The numbers of the protocol are from memory.
type hislip struct {
	sync, async net.Conn
	most        uint64        // bytes of payload the instrument takes in one part
	cleared     chan struct{} // room for one
	out         chan struct{} // one slot: who takes it sends
	rest        []byte        // of a part that did not fit the reader's buffer; only Read touches it

	mu    sync.Mutex // guards what follows; never held while sending
	next  uint32     // number of the next message
	last  uint32     // number of the latest one
	whole bool       // a reply was read to its end since the latest message
}

// The numbers of the messages used.
const (
	hsInitialize = iota
	hsInitializeResponse
	hsFatalError
	hsError
	hsAsyncLock
	hsAsyncLockResponse
	hsData
	hsDataEnd
	hsDeviceClearComplete
	hsDeviceClearAcknowledge
	hsInterrupted                         = 13
	hsAsyncMaximumMessageSize             = 15
	hsAsyncMaximumMessageSizeReply        = 16
	hsAsyncInitialize                     = 17
	hsAsyncInitializeResponse             = 18
	hsAsyncDeviceClear                    = 19
	hsAsyncDeviceClearAcknowledge         = 23
	hsFirstID                      uint32 = 0xffffff00
	hsHead                                = 16      // bytes of a header
	hsMostPayload                         = 1 << 26 // bytes; more is no instrument's
)

// hsMessage is a header with its payload: "HS", type, control code, parameter,
// length of the payload, all big-endian.
type hsMessage struct {
	kind, code byte
	param      uint32
	payload    []byte
}

func (m hsMessage) bytes() []byte {
	b := append([]byte{'H', 'S', m.kind, m.code}, binary.BigEndian.AppendUint32(nil, m.param)...)
	return append(binary.BigEndian.AppendUint64(b, uint64(len(m.payload))), m.payload...)
}

// readHS reads one message; the instrument's error messages are errors.
func readHS(r io.Reader) (m hsMessage, err error) {
	head := make([]byte, hsHead)
	if _, err := io.ReadFull(r, head); err != nil {
		return m, err
	}
	size := binary.BigEndian.Uint64(head[8:])
	if head[0] != 'H' || head[1] != 'S' || size > hsMostPayload {
		return m, fmt.Errorf("%q is no HiSLIP message; is another service on this port?", head)
	}
	m = hsMessage{kind: head[2], code: head[3], param: binary.BigEndian.Uint32(head[4:]), payload: make([]byte, size)}
	if _, err := io.ReadFull(r, m.payload); err != nil {
		return m, err
	}
	if m.kind == hsFatalError || m.kind == hsError {
		return m, fmt.Errorf("the instrument refuses: error %d %q", m.code, m.payload)
	}
	return m, nil
}

// dialHiSLIP opens both connections and takes the instrument's own lock.
func dialHiSLIP(ctx context.Context, a Address) (io.ReadWriteCloser, error) {
	ctx, cancel := context.WithTimeout(ctx, connectWithin)
	defer cancel()
	h := &hislip{cleared: make(chan struct{}, 1), out: make(chan struct{}, 1), next: hsFirstID, last: hsFirstID - 1}
	h.out <- struct{}{}
	err := h.open(ctx, a)
	if err != nil {
		return nil, errors.Join(err, h.Close())
	}
	return h, nil
}

func (h *hislip) open(ctx context.Context, a Address) (err error) {
	if h.sync, err = dialTCP(ctx, a); err != nil {
		return err
	}
	// Version 1.0, and a vendor of our own: two letters that IVI has not given away.
	hello := hsMessage{kind: hsInitialize, param: 1<<24 | 'N'<<8 | 'B', payload: []byte(a.Path)}
	session, err := exchangeHS(ctx, h.sync, hello, hsInitializeResponse)
	if err != nil {
		return fmt.Errorf("open a session with %s: %w", a.Path, err)
	}
	if h.async, err = dialTCP(ctx, a); err != nil {
		return err
	}
	if _, err = exchangeHS(ctx, h.async, hsMessage{kind: hsAsyncInitialize, param: session.param & 0xffff}, hsAsyncInitializeResponse); err != nil {
		return fmt.Errorf("open the second channel: %w", err)
	}
	size := hsMessage{kind: hsAsyncMaximumMessageSize, payload: binary.BigEndian.AppendUint64(nil, hsMostPayload)}
	most, err := exchangeHS(ctx, h.async, size, hsAsyncMaximumMessageSizeReply)
	if err != nil {
		return fmt.Errorf("agree on the size of messages: %w", err)
	}
	if len(most.payload) != 8 || binary.BigEndian.Uint64(most.payload) <= hsHead {
		return fmt.Errorf("the instrument takes messages of %x bytes", most.payload)
	}
	h.most = binary.BigEndian.Uint64(most.payload) - hsHead
	return h.lock(ctx)
}

// lockWithin is how long the instrument may wait for another client's lock to be released.
const lockWithin = 500 * time.Millisecond

// lock takes the exclusive lock, so that no other client's message comes between ours.
func (h *hislip) lock(ctx context.Context) error {
	request := hsMessage{kind: hsAsyncLock, code: 1, param: uint32(lockWithin.Milliseconds())}
	got, err := exchangeHS(ctx, h.async, request, hsAsyncLockResponse)
	switch {
	case err != nil:
		return fmt.Errorf("lock the instrument: %w", err)
	case got.code == 0:
		return fmt.Errorf("%w: another client has locked the instrument", ErrBusy)
	case got.code != 1:
		return fmt.Errorf("lock the instrument: it answers %d", got.code)
	}
	return nil
}

// exchangeHS sends one message and waits for one of a kind; others, such as
// service requests, are passed over.
func exchangeHS(ctx context.Context, c net.Conn, m hsMessage, kind byte) (hsMessage, error) {
	stop := context.AfterFunc(ctx, func() { c.SetDeadline(time.Unix(1, 0)) })
	defer func() {
		if stop() {
			c.SetDeadline(time.Time{})
		}
	}()
	if _, err := c.Write(m.bytes()); err != nil {
		return m, err
	}
	for {
		got, err := readHS(c)
		if ctx.Err() != nil {
			return m, ended(ctx)
		}
		if err != nil || got.kind == kind {
			return got, err
		}
	}
}

// Write sends one message, in parts where it is longer than the instrument takes.
func (h *hislip) Write(b []byte) (n int, err error) {
	<-h.out
	defer func() { h.out <- struct{}{} }()
	m := h.number()
	for {
		part := uint64(len(b) - n)
		if part <= h.most {
			m.kind = hsDataEnd
		}
		m.payload = b[n : n+int(min(part, h.most))]
		if _, err := h.sync.Write(m.bytes()); err != nil {
			return n, err
		}
		if n += len(m.payload); n == len(b) {
			return n, nil
		}
		m.code = 0
	}
}

// number gives the head of the next message.
func (h *hislip) number() hsMessage {
	h.mu.Lock()
	defer h.mu.Unlock()
	m := hsMessage{kind: hsData, param: h.next}
	if h.whole {
		m.code = 1 // the end of the reply before has been read
	}
	h.last, h.next, h.whole = h.next, h.next+2, false
	return m
}

// Read gives the reply to the latest message, ended by NL whether the
// instrument sent one or not.
func (h *hislip) Read(b []byte) (int, error) {
	for len(h.rest) == 0 {
		m, err := readHS(h.sync)
		if err != nil {
			return 0, err
		}
		switch m.kind {
		case hsData, hsDataEnd:
			h.take(m)
		case hsDeviceClearAcknowledge:
			select {
			case h.cleared <- struct{}{}:
			default:
			}
		}
	}
	n := copy(b, h.rest)
	h.rest = h.rest[n:]
	return n, nil
}

// take keeps a part of a reply, if it belongs to the latest message. Only Read calls it.
func (h *hislip) take(m hsMessage) {
	h.mu.Lock()
	defer h.mu.Unlock()
	if m.param != h.last {
		return
	}
	h.rest = m.payload
	if m.kind != hsDataEnd {
		return
	}
	h.whole = true
	if n := len(h.rest); n == 0 || h.rest[n-1] != '\n' {
		h.rest = append(h.rest, '\n')
	}
}

// Clear is the device clear of HiSLIP: both sides forget what is under way,
// and numbers begin anew.
func (h *hislip) Clear(ctx context.Context) error {
	select {
	case <-h.out:
		defer func() { h.out <- struct{}{} }()
	case <-ctx.Done():
		return fmt.Errorf("a message is still being sent: %w", ended(ctx))
	}
	select {
	case <-h.cleared: // of a clear that was given up
	default:
	}
	if _, err := exchangeHS(ctx, h.async, hsMessage{kind: hsAsyncDeviceClear}, hsAsyncDeviceClearAcknowledge); err != nil {
		return lost(fmt.Errorf("ask for a device clear: %w", err))
	}
	h.mu.Lock()
	h.next, h.last, h.whole = hsFirstID, hsFirstID-1, false
	h.mu.Unlock()
	if _, err := h.sync.Write(hsMessage{kind: hsDeviceClearComplete}.bytes()); err != nil {
		return lost(err)
	}
	select {
	case <-h.cleared:
		return nil
	case <-ctx.Done():
		return fmt.Errorf("the device clear was not acknowledged: %w", ended(ctx))
	}
}

// Close ends both connections, which gives the lock back.
func (h *hislip) Close() error {
	var errs []error
	for _, c := range []net.Conn{h.sync, h.async} {
		if c != nil {
			errs = append(errs, c.Close())
		}
	}
	return errors.Join(errs...)
}
