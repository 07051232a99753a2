package link

import (
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"io"
	"net"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"
)

// hsServer is a HiSLIP instrument of the test's own: its own reading and
// writing of messages, from the same text of the standard.
type hsServer struct {
	t      *testing.T
	ln     net.Listener
	most   uint64                     // the longest message it takes
	answer func(text string) []string // parts of the reply; nil: none
	refuse byte                       // its answer to a lock

	onClear func()

	wg      sync.WaitGroup
	mu      sync.Mutex // guards what follows
	got     []string   // messages, and "clear"
	rmt     []byte     // control code of each message's first part
	sizes   []int      // of the parts
	sync    net.Conn
	ids     []uint32
	version uint32
	name    string
	conns   []net.Conn
}

func hsServe(t *testing.T, s *hsServer) Address {
	t.Helper()
	var err error
	if s.ln, err = net.Listen("tcp", "127.0.0.1:0"); err != nil {
		t.Fatal(err)
	}
	s.t = t
	if s.most == 0 {
		s.most = 1 << 20
	}
	s.wg.Go(func() {
		for {
			c, err := s.ln.Accept()
			if err != nil {
				return
			}
			s.mu.Lock()
			s.conns = append(s.conns, c)
			s.mu.Unlock()
			s.wg.Go(func() { s.serve(c) })
		}
	})
	t.Cleanup(func() {
		s.ln.Close()
		s.mu.Lock()
		for _, c := range s.conns {
			c.Close()
		}
		s.mu.Unlock()
		s.wg.Wait()
	})
	a, err := Parse("hislip://" + s.ln.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func hsPut(w io.Writer, kind, code byte, param uint32, payload string) {
	var b bytes.Buffer
	b.WriteString("HS")
	b.WriteByte(kind)
	b.WriteByte(code)
	binary.Write(&b, binary.BigEndian, param)
	binary.Write(&b, binary.BigEndian, uint64(len(payload)))
	b.WriteString(payload)
	w.Write(b.Bytes())
}

func (s *hsServer) serve(c net.Conn) {
	defer c.Close()
	var message []byte
	for {
		var head struct {
			HS         [2]byte
			Kind, Code byte
			Param      uint32
			Size       uint64
		}
		if binary.Read(c, binary.BigEndian, &head) != nil {
			return
		}
		payload := make([]byte, head.Size)
		if _, err := io.ReadFull(c, payload); err != nil {
			return
		}
		s.mu.Lock()
		switch head.Kind {
		case 0: // Initialize
			s.version, s.name, s.sync = head.Param>>16, string(payload), c
			hsPut(c, 1, 0, 1<<24|0x1234, "")
		case 17: // AsyncInitialize
			if head.Param == 0x1234 {
				hsPut(c, 20, 0x40, 0, "") // a service request in between
				hsPut(c, 18, 0, 'X'<<8|'Y', "")
			} else {
				hsPut(c, 2, 3, 0, "no such session")
			}
		case 15: // AsyncMaximumMessageSize
			hsPut(c, 16, 0, 0, string(binary.BigEndian.AppendUint64(nil, s.most)))
		case 4: // AsyncLock
			hsPut(c, 5, 1-s.refuse, 0, "")
		case 19: // AsyncDeviceClear
			s.got = append(s.got, "clear")
			hsPut(c, 23, 0, 0, "")
		case 8: // DeviceClearComplete
			if message = nil; s.onClear != nil {
				s.onClear()
			}
			hsPut(c, 9, 0, 0, "")
		case 6, 7: // Data, DataEND
			if len(message) == 0 {
				s.rmt, s.ids = append(s.rmt, head.Code), append(s.ids, head.Param)
			}
			s.sizes = append(s.sizes, len(payload))
			message = append(message, payload...)
			if head.Kind == 7 {
				text := strings.TrimSuffix(string(message), "\n")
				s.got = append(s.got, text)
				s.reply(c, head.Param, text)
				message = nil
			}
		default:
			s.t.Errorf("message %d", head.Kind)
		}
		s.mu.Unlock()
	}
}

func (s *hsServer) reply(c net.Conn, id uint32, text string) {
	parts := s.answer(text)
	for n, p := range parts {
		kind := byte(6)
		if n == len(parts)-1 {
			kind = 7
		}
		hsPut(c, kind, 0, id, p)
	}
}

func (s *hsServer) received() []string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.got)
}

// echoes answers a query with its own text in lower case, without an NL.
func echoes(text string) []string {
	if !strings.Contains(text, "?") {
		return nil
	}
	return []string{strings.ToLower(text)}
}

func dialHS(t *testing.T, a Address, timeout time.Duration) *Link {
	t.Helper()
	l, err := Open(t.Context(), a, Options{Timeout: timeout})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l
}

func TestHiSLIPQuery(t *testing.T) {
	s := &hsServer{answer: echoes}
	l := dialHS(t, hsServe(t, s), 5*time.Second)
	for _, q := range []string{"*IDN?", "READ?", "FETC?"} {
		if got, err := l.Query(t.Context(), q); err != nil || got != strings.ToLower(q) {
			t.Errorf("%s: %q, %v", q, got, err)
		}
	}
	if err := l.Send(t.Context(), "OUTP OFF"); err != nil {
		t.Error(err)
	}
	if got, err := l.Query(t.Context(), "*OPC?"); err != nil || got != "*opc?" {
		t.Errorf("%q, %v", got, err)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	// Version 1.0; numbers begin at ffffff00 and go up by two; the control code
	// says whether the reply before was read to its end (IVI-6.1, from memory).
	if s.version != 0x100 || s.name != "hislip0" {
		t.Errorf("version %x, sub-address %q", s.version, s.name)
	}
	if want := []uint32{0xffffff00, 0xffffff02, 0xffffff04, 0xffffff06, 0xffffff08}; !slices.Equal(s.ids, want) {
		t.Errorf("numbers %x, want %x", s.ids, want)
	}
	if want := []byte{0, 1, 1, 1, 0}; !slices.Equal(s.rmt, want) {
		t.Errorf("reply before delivered: %v, want %v", s.rmt, want)
	}
}

// A reply in parts, with NL inside and none at its end; a message in parts,
// since the instrument takes few bytes at a time.
func TestHiSLIPParts(t *testing.T) {
	s := &hsServer{most: hsHead + 10, answer: func(string) []string { return []string{"#15a\n", "b", "\nc"} }}
	l := dialHS(t, hsServe(t, s), 5*time.Second)
	turn, err := l.Acquire(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer turn.Release()
	if err := turn.Send(t.Context(), "TRACE:DATA? CH1,1000"); err != nil {
		t.Fatal(err)
	}
	if got, err := turn.ReadFull(t.Context(), 9); err != nil || string(got) != "#15a\nb\nc\n" {
		t.Errorf("%q, %v", got, err)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if !slices.Equal(s.sizes, []int{10, 10, 1}) || s.got[0] != "TRACE:DATA? CH1,1000" {
		t.Errorf("parts of %v bytes, %q", s.sizes, s.got)
	}
}

// A late reply carries the number of its own question, and is dropped: both
// when it comes while the device is being cleared and when nobody clears it.
func TestHiSLIPLateReply(t *testing.T) {
	s := &hsServer{}
	late := func() {}
	s.answer = func(text string) []string {
		if text != "READ?" {
			late()
			return echoes(text)
		}
		c, id := s.sync, s.ids[len(s.ids)-1]
		late = func() { hsPut(c, 7, 0, id, "late"); late = func() {} }
		return nil
	}
	s.onClear = func() { late() }
	l := dialHS(t, hsServe(t, s), 400*time.Millisecond)
	if _, err := l.Query(t.Context(), "READ?"); !errors.Is(err, ErrTimeout) {
		t.Fatalf("got %v, want ErrTimeout", err)
	}
	if got, err := l.Query(t.Context(), "FETC?"); err != nil || got != "fetc?" {
		t.Errorf("%q, %v", got, err)
	}
	turn, err := l.Acquire(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer turn.Release()
	for _, q := range []string{"READ?", "FETC?"} {
		if err := turn.Send(t.Context(), q); err != nil {
			t.Fatal(err)
		}
	}
	if got, err := turn.ReadLine(t.Context()); err != nil || got != "fetc?" {
		t.Errorf("without a clear: %q, %v", got, err)
	}
	if got := s.received(); !slices.Equal(got, []string{"READ?", "clear", "FETC?", "READ?", "FETC?"}) {
		t.Errorf("received %q", got)
	}
}

// A reply longer than all buffers is being sent when the device is cleared:
// its bytes must not hold up the clear's own answer.
func TestHiSLIPClearInALongReply(t *testing.T) {
	long := strings.Repeat("x", 1<<20)
	s := &hsServer{answer: func(text string) []string {
		if text == "TRAC?" {
			return []string{long, long, long}
		}
		return echoes(text)
	}}
	l := dialHS(t, hsServe(t, s), 5*time.Second)
	if err := l.Send(t.Context(), "TRAC?"); err != nil {
		t.Fatal(err)
	}
	if err := l.Clear(t.Context()); err != nil {
		t.Fatal(err)
	}
	if got, err := l.Query(t.Context(), "*IDN?"); err != nil || got != "*idn?" {
		t.Errorf("%.20q, %v", got, err)
	}
}

func TestHiSLIPRefusals(t *testing.T) {
	a := hsServe(t, &hsServer{answer: echoes, refuse: 1})
	if _, err := Open(t.Context(), a, Options{}); !errors.Is(err, ErrBusy) || !strings.Contains(err.Error(), "another client") {
		t.Errorf("locked: %v", err)
	}
	other := listen(t, func(c net.Conn) { io.WriteString(c, "220 this is a mail server\r\n"); io.Copy(io.Discard, c) })
	b, err := Parse("hislip://" + other.Host)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Open(t.Context(), b, Options{}); err == nil || !strings.Contains(err.Error(), "no HiSLIP message") {
		t.Errorf("another service: %v", err)
	}
	mute := listen(t, func(c net.Conn) { io.Copy(io.Discard, c) })
	if b, err = Parse("hislip://" + mute.Host + "/inst1"); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(t.Context(), 50*time.Millisecond)
	defer cancel()
	if _, err := Open(ctx, b, Options{}); !errors.Is(err, ErrTimeout) || !strings.Contains(err.Error(), "inst1") {
		t.Errorf("mute: %v", err)
	}
}

func TestHiSLIPHungUpAndReopened(t *testing.T) {
	s := &hsServer{answer: echoes}
	l := dialHS(t, hsServe(t, s), 5*time.Second)
	s.mu.Lock()
	s.sync.Close()
	s.mu.Unlock()
	if _, err := l.Query(t.Context(), "*IDN?"); !errors.Is(err, ErrLost) {
		t.Errorf("hung up: %v, want ErrLost", err)
	}
	if err := l.Reopen(t.Context()); err != nil {
		t.Fatal(err)
	}
	if got, err := l.Query(t.Context(), "*IDN?"); err != nil || got != "*idn?" {
		t.Errorf("%q, %v", got, err)
	}
}
