package scpi

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"pgregory.net/rapid"

	"nightbench/instruments/link"
)

func TestQueryBlock(t *testing.T) {
	for _, c := range []struct{ name, reply, want, says string }{
		{"NL", `#15he\nlo\n`, "he\nlo", ""},                           // a payload may hold NL
		{"CRNL", `#3005hello\r\n`, "hello", ""},                       // RTB2000 p. 369: digits as needed
		{"TwoNL", `#9000000005hello\n\n`, "hello", ""},                // Siglent SDS EN11D change list
		{"None", `#15hello`, "hello", ""},                             //
		{"Empty", `#10\n`, "", ""},                                    //
		{"Late", "#15he\n. 900ms\n< llo\n. 10ms\n< \\n", "hello", ""}, // pauses below the time-out
		{"Short", `#15hell`, "", "got 4 of 5 bytes"},                  //
		{"Long", `#15hello!\n`, "", `"!\n" came after the 5 bytes`},   //
		{"LongLater", "#15hello\\n\n. 15ms\n< !\\n", "", "came after the 5 bytes"},
		{"Indefinite", `#0hello\n`, "", "indefinite length"},
		{"NoHash", `hello\n`, "", "must begin with"},
		{"BadDigit", `#x5hello\n`, "", "begins no block"},
		{"BadCount", `#2a5hello\n`, "", "the count of the block"},
		{"TooLarge", `#9999999999x`, "", "999999999 bytes is announced"},
		{"Negative", `#2-5hello\n`, "", "the count of the block"},
	} {
		t.Run(c.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				conn := play(t, inStep+"> CURV?\\n\n< "+c.reply+"\n", Options{})
				got, err := conn.QueryBlock(t.Context(), "CURV?", 1000)
				if c.says == "" && (err != nil || string(got) != c.want) {
					t.Errorf("got %q, %v; want %q", got, err, c.want)
				}
				if c.says != "" && (err == nil || got != nil || !strings.Contains(err.Error(), c.says)) {
					t.Errorf("got %q, %v; want an error with %q", got, err, c.says)
				}
				if conn.InStep() != (err == nil) {
					t.Errorf("in step %v after %v", conn.InStep(), err)
				}
			})
		})
	}
}

func TestBlockLead(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		// Siglent SDS1104X-E programming guide p. 142
		c := play(t, inStep+"> C1:WF? ALL\\n\n< C1:WF ALL,#9000000002ab\\n\\n\n> C1:WF? ALL\\n\n< C1:WF DAT,#12ab\\n\n", Options{BlockLead: "C1:WF ALL,"})
		if got, err := c.QueryBlock(t.Context(), "C1:WF? ALL", 100); err != nil || string(got) != "ab" {
			t.Errorf("got %q, %v", got, err)
		}
		if _, err := c.QueryBlock(t.Context(), "C1:WF? ALL", 100); !errors.Is(err, ErrFraming) {
			t.Errorf("another lead: %v, want ErrFraming", err)
		}
	})
}

func TestErrors(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ask := "> SYST:ERR?\\n\n< "
		c := play(t, inStep+ask+"-222,\"Data out of range;VOLT \"\"99\"\"\"\\n\n"+ask+"-350,\"Too many errors\"\\n\n"+ask+"Fuse blown\\n\n"+ask+"+0,\"No error\"\\n\n"+
			ask+"1,\"a\"\\n\n"+ask+"2,\"b\"\\n\n"+ask+"3,\"c\"\\n\n"+ask+"4,\"d\"\\n\n", Options{ErrorDepth: 3})
		got, err := c.Errors(t.Context())
		want := []Fault{{-222, `Data out of range;VOLT "99"`}, {-350, "Too many errors"}, {0, "Fuse blown"}}
		if err != nil || fmt.Sprint(got) != fmt.Sprint(want) || !got[1].Overflow() || got[0].Overflow() {
			t.Errorf("got %v, %v", got, err)
		}
		if got, err := c.Errors(t.Context()); !errors.Is(err, ErrQueue) || len(got) != 4 {
			t.Errorf("a queue that never ends: %v, %v", got, err)
		}
	})
}

func TestParseFault(t *testing.T) {
	for _, c := range []struct {
		reply string
		code  int
		text  string
		ok    bool
	}{
		{`0,"No error"`, 0, "No error", false},  // GW Instek PSU p. 135
		{`+0,"No error"`, 0, "No error", false}, // Chroma 19020 p. 99
		{`0 No Error`, 0, "No Error", false},    // Scientific PSD7303 p. 39
		{`0`, 0, "", false},                     //
		{`-113,"Undefined header"`, -113, "Undefined header", true},
		{`113, "Undefined header"`, 113, "Undefined header", true}, // Tektronix, positive
		{`-410, Query INTERRUPTED`, -410, "Query INTERRUPTED", true},
		{`Voltage too high`, 0, "Voltage too high", true}, // GW Instek GPD-3303 pp. 41-42: free text
		{``, 0, "", true},
		{`0x10`, 0, "0x10", true},
	} {
		f, ok := ParseFault(c.reply)
		if f.Code != c.code || f.Text != c.text || ok != c.ok {
			t.Errorf("%q: %+v, %v", c.reply, f, ok)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		f := Fault{Code: rapid.IntRange(-32768, 32767).Draw(t, "code"), Text: rapid.StringMatching(`[!-~]([ -~]*[!-~])?`).Draw(t, "text")}
		if back, ok := ParseFault(f.Error()); back != f || ok != (f.Code != 0) {
			t.Fatalf("%s → %+v, %v", f.Error(), back, ok)
		}
	})
}

// Whatever bytes a block holds, it comes through the listener's splitter and
// grammar, and back through the client.
func TestBlockRoundTrip(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		data := rapid.SliceOfN(rapid.Byte(), 0, 300).Draw(rt, "data")
		chunk := rapid.IntRange(1, 50).Draw(rt, "chunk")
		var sp Splitter
		stream := []byte("MEM:DATA " + FormatBlock(data) + ";*OPC?\nVOLT?\n")
		var messages []string
		for len(stream) > 0 {
			n := min(chunk, len(stream))
			sp.Feed(stream[:n])
			stream = stream[n:]
			for {
				m, ok, err := sp.Next()
				if err != nil {
					rt.Fatal(err)
				}
				if !ok {
					break
				}
				messages = append(messages, string(m))
			}
		}
		if len(messages) != 2 || messages[1] != "VOLT?" {
			rt.Fatalf("split into %q", messages)
		}
		u, ok, err := NewParser([]byte(messages[0])).Next()
		if err != nil || !ok || len(u.Params) != 1 || !bytes.Equal(u.Params[0].Bytes, data) {
			rt.Fatalf("parsed as %+v, %v", u, err)
		}
		synctest.Test(t, func(t *testing.T) {
			ours, theirs := net.Pipe()
			go scripted(theirs, map[string]string{"CURV?": FormatBlock(data) + "\n"})
			got, err := overPipe(t, ours, Options{}).QueryBlock(t.Context(), "CURV?", 1000)
			if err != nil || !bytes.Equal(got, data) {
				t.Errorf("came back as %q, %v", got, err)
			}
			theirs.Close()
			synctest.Wait()
		})
	})
}

func TestSplitter(t *testing.T) {
	sp := Splitter{Limit: 20}
	sp.Feed([]byte("A\r\n\nB \"#15\"\nC #15ab\ncd\nFOO#19\n" + strings.Repeat("x", 30)))
	next := func(want string, fault int) {
		t.Helper()
		m, ok, err := sp.Next()
		if f := (Fault{}); string(m) != want || !ok || fault != 0 && (!errors.As(err, &f) || f.Code != fault) || fault == 0 && err != nil {
			t.Errorf("got %q, %v, %v; want %q", m, ok, err, want)
		}
	}
	for _, want := range []string{"A\r", "", `B "#15"`, "C #15ab\ncd", "FOO#19"} {
		next(want, 0)
	}
	if _, ok, _ := sp.Next(); ok {
		t.Error("a message without an end")
	}
	sp.Feed([]byte("yyy\nD\n"))
	next("", InputOverrun)
	next("D", 0)
	sp.Feed([]byte("half"))
	sp.Reset()
	sp.Feed([]byte("E\n"))
	next("E", 0)
}

func FuzzParser(f *testing.F) {
	for _, seed := range []string{"*IDN?", ":VOLT 5 MV;CURR? MAX", `DISP:TEXT "a""b",'c'`, "A #15hello,#H1F,#0abc", "R (@1,3:5)", "A 1 E -3V,\x80;;", "#", "A #", "A #9", "A 1e"} {
		f.Add([]byte(seed))
	}
	s := newSupply()
	f.Fuzz(func(t *testing.T, message []byte) {
		p := NewParser(message)
		for units := 0; ; units++ {
			u, ok, err := p.Next()
			if err != nil {
				if fault, is := err.(Fault); !is || fault.Code >= -99 || fault.Code < -199 {
					t.Fatalf("%q: %v is no command error", message, err)
				}
				break
			}
			if !ok {
				break
			}
			if len(u.Nodes) == 0 || units > len(message) {
				t.Fatalf("%q: unit %+v", message, u)
			}
		}
		if out := s.Execute(context.Background(), message); out != nil && !bytes.HasSuffix(out, []byte("\n")) {
			t.Fatalf("%q answered %q", message, out)
		}
		s.log = nil
		var sp Splitter
		sp.Feed(append(message, '\n'))
		for {
			if _, ok, _ := sp.Next(); !ok {
				break
			}
		}
	})
}

// A client and a device, over a pipe in a bubble: the same messages mean the
// same on both sides.
func TestClientAgainstDevice(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		s := newSupply()
		go serve(t.Context(), theirs, s.Device)
		c := overPipe(t, ours, Options{})
		if err := c.Write(t.Context(), "VOLT "+FormatNumber(3.3)); err != nil {
			t.Error(err)
		}
		if n, err := c.QueryNumber(t.Context(), "VOLT?"); err != nil || n.Value != 3.3 {
			t.Errorf("VOLT? %+v, %v", n, err)
		}
		start := time.Now()
		if _, err := c.Query(t.Context(), "FOO?"); !errors.Is(err, link.ErrTimeout) || time.Since(start) != time.Second {
			t.Errorf("an unknown query: %v after %v", err, time.Since(start))
		}
		if faults, err := c.Errors(t.Context()); err != nil || len(faults) != 1 || faults[0].Code != UndefinedHeader {
			t.Errorf("its reason: %v, %v", faults, err)
		}
		theirs.Close()
		synctest.Wait()
	})
}

// serve answers messages from a stream until it ends.
func serve(ctx context.Context, rw io.ReadWriter, d *Device) {
	var sp Splitter
	buf := make([]byte, 512)
	for {
		n, err := rw.Read(buf)
		if err != nil {
			return
		}
		sp.Feed(buf[:n])
		for {
			m, ok, err := sp.Next()
			if !ok {
				break
			}
			if err != nil {
				d.Push(err)
				continue
			}
			rw.Write(d.Execute(ctx, m))
		}
	}
}
