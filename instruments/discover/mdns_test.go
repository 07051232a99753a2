package discover

import (
	"context"
	"errors"
	"net"
	"net/netip"
	"slices"
	"testing"
	"time"

	"golang.org/x/net/dns/dnsmessage"
)

func name(s string) dnsmessage.Name { return dnsmessage.MustNewName(s) }

func record(n string, body dnsmessage.ResourceBody) dnsmessage.Resource {
	return dnsmessage.Resource{Header: dnsmessage.ResourceHeader{Name: name(n), Class: dnsmessage.ClassINET, TTL: 120}, Body: body}
}

// announcing is a network of two instruments: a meter with a socket for SCPI,
// and a scope that announces its web page only. It answers on loopback.
func announcing(t *testing.T, asked chan<- []string) netip.AddrPort {
	t.Helper()
	conn, err := net.ListenUDP("udp4", &net.UDPAddr{IP: net.IPv4(127, 0, 0, 1)})
	if err != nil {
		t.Fatal(err)
	}
	done := make(chan struct{})
	t.Cleanup(func() { conn.Close(); <-done })
	const meter, scope = `Bench\ meter`, "Scope"
	answers := [][]dnsmessage.Resource{
		{record("_lxi._tcp.local.", &dnsmessage.PTRResource{PTR: name(meter + "._lxi._tcp.local.")}),
			record(meter+"._lxi._tcp.local.", &dnsmessage.SRVResource{Port: 80, Target: name("meter.local.")}),
			record("meter.local.", &dnsmessage.AResource{A: [4]byte{192, 0, 2, 11}})},
		{record("_scpi-raw._tcp.local.", &dnsmessage.PTRResource{PTR: name(meter + "._scpi-raw._tcp.local.")}),
			record(meter+"._scpi-raw._tcp.local.", &dnsmessage.SRVResource{Port: 5024, Target: name("meter.local.")}),
			record(meter+"._scpi-raw._tcp.local.", &dnsmessage.TXTResource{TXT: []string{"txtvers=1", "Manufacturer=GROWHOUSE", "Model=DM-1"}})},
		{record("_lxi._tcp.local.", &dnsmessage.PTRResource{PTR: name(scope + "._lxi._tcp.local.")}),
			record(scope+"._lxi._tcp.local.", &dnsmessage.SRVResource{Port: 80, Target: name("scope.local.")}),
			record("scope.local.", &dnsmessage.AResource{A: [4]byte{192, 0, 2, 12}})},
		{record("_http._tcp.local.", &dnsmessage.PTRResource{PTR: name("Printer._http._tcp.local.")}),
			record("_lxi._tcp.local.", &dnsmessage.PTRResource{PTR: name("Nowhere._lxi._tcp.local.")})},
	}
	go func() {
		defer close(done)
		buf := make([]byte, 9000)
		for {
			n, from, err := conn.ReadFromUDP(buf)
			if err != nil {
				return
			}
			var q dnsmessage.Message
			if err := q.Unpack(buf[:n]); err != nil {
				t.Errorf("the question: %v", err)
				return
			}
			var names []string
			for _, one := range q.Questions {
				names = append(names, one.Name.String()+" "+one.Type.String())
			}
			asked <- names
			conn.WriteToUDP([]byte("no DNS at all"), from)
			for _, a := range answers {
				m := dnsmessage.Message{Header: dnsmessage.Header{Response: true}, Answers: a[:1], Additionals: a[1:]}
				b, err := m.Pack()
				if err != nil {
					t.Errorf("an answer: %v", err)
				}
				conn.WriteToUDP(b, from)
			}
		}
	}()
	return conn.LocalAddr().(*net.UDPAddr).AddrPort()
}

func TestAnnounced(t *testing.T) {
	asked := make(chan []string, 8)
	found, err := Announced(t.Context(), announcing(t, asked), 300*time.Millisecond)
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, f := range found {
		got = append(got, f.Address+" "+f.Words)
	}
	want := []string{
		"tcp://192.0.2.11:5024 Bench meter, announces _scpi-raw (GROWHOUSE, DM-1)",
		"tcp://192.0.2.12:5025 Scope, announces _lxi; it announces no SCPI socket: the port is the usual one",
	}
	if !slices.Equal(got, want) {
		t.Errorf("found\n%q\nwant\n%q", got, want)
	}
	if q := <-asked; !slices.Equal(q, []string{"_scpi-raw._tcp.local. TypePTR", "_lxi._tcp.local. TypePTR"}) {
		t.Errorf("asked %q", q)
	}
}

func TestAnnouncedEndsWithItsContext(t *testing.T) {
	ctx, cancel := context.WithTimeoutCause(t.Context(), 30*time.Millisecond, errors.New("interrupted"))
	defer cancel()
	begun := time.Now()
	if _, err := Announced(ctx, announcing(t, make(chan []string, 8)), time.Minute); err == nil || err.Error() != "interrupted" {
		t.Errorf("got %v", err)
	}
	if took := time.Since(begun); took > 10*time.Second {
		t.Errorf("took %v", took)
	}
}
