package discover

import (
	"context"
	"errors"
	"fmt"
	"net"
	"net/netip"
	"os"
	"slices"
	"strings"
	"time"

	"golang.org/x/net/dns/dnsmessage"
	"golang.org/x/net/ipv4"
)

// Services are what instruments announce: a socket that speaks SCPI, and LXI
// (names from memory).
var services = []string{"_scpi-raw._tcp.local.", "_lxi._tcp.local."}

// MulticastDNS is where the question goes (RFC 6762 section 3).
var MulticastDNS = netip.MustParseAddrPort("224.0.0.251:5353")

// scpiPort is the usual socket of an LXI instrument, whose announcement names
// only its web page.
const scpiPort = 5025

// Announced asks once, from a port of its own so that answers come straight
// back (RFC 6762 section 6.7), and gathers the answers for a while.
func Announced(ctx context.Context, to netip.AddrPort, wait time.Duration) ([]Found, error) {
	question, err := ask()
	if err != nil {
		return nil, err
	}
	conn, err := net.ListenUDP("udp4", nil)
	if err != nil {
		return nil, err
	}
	defer conn.Close()
	if err := send(conn, question, to); err != nil {
		return nil, fmt.Errorf("ask the network for instruments: %w", err)
	}
	stop := context.AfterFunc(ctx, func() { conn.SetReadDeadline(time.Unix(1, 0)) })
	defer stop()
	conn.SetReadDeadline(time.Now().Add(wait))
	k := &known{}
	buf := make([]byte, 9000) // the largest multicast DNS message (RFC 6762 section 17)
	for {
		n, err := conn.Read(buf)
		if errors.Is(err, os.ErrDeadlineExceeded) {
			return k.found(), context.Cause(ctx)
		}
		if err != nil {
			return nil, err
		}
		k.learn(buf[:n])
	}
}

// ask is the question for all services in one message.
func ask() ([]byte, error) {
	m := dnsmessage.Message{}
	for _, s := range services {
		name, err := dnsmessage.NewName(s)
		if err != nil {
			return nil, err
		}
		m.Questions = append(m.Questions, dnsmessage.Question{Name: name, Type: dnsmessage.TypePTR, Class: dnsmessage.ClassINET})
	}
	return m.Pack()
}

// send sends the question on every network that carries multicast, or to one address.
func send(conn *net.UDPConn, question []byte, to netip.AddrPort) error {
	if !to.Addr().IsMulticast() {
		_, err := conn.WriteToUDPAddrPort(question, to)
		return err
	}
	all, err := net.Interfaces()
	if err != nil {
		return err
	}
	p := ipv4.NewPacketConn(conn)
	err = errors.New("no network carries multicast")
	for _, i := range all {
		if i.Flags&net.FlagMulticast == 0 || i.Flags&net.FlagUp == 0 || i.Flags&net.FlagLoopback != 0 || p.SetMulticastInterface(&i) != nil {
			continue
		}
		if _, failed := conn.WriteToUDPAddrPort(question, to); failed == nil {
			err = nil
		}
	}
	return err
}

// known is what the answers say: who offers what, where, and at which address.
type known struct {
	offers []offer
	where  map[string]dnsmessage.SRVResource
	texts  map[string][]string
	hosts  map[string]netip.Addr
}

type offer struct{ service, name string }

// learn takes one message; what is not understood is passed over.
func (k *known) learn(b []byte) {
	var m dnsmessage.Message
	if m.Unpack(b) != nil || !m.Response {
		return
	}
	if k.where == nil {
		k.where, k.texts, k.hosts = map[string]dnsmessage.SRVResource{}, map[string][]string{}, map[string]netip.Addr{}
	}
	for _, r := range slices.Concat(m.Answers, m.Additionals) {
		name := r.Header.Name.String()
		switch body := r.Body.(type) {
		case *dnsmessage.PTRResource:
			if o := (offer{name, body.PTR.String()}); slices.Contains(services, name) && !slices.Contains(k.offers, o) {
				k.offers = append(k.offers, o)
			}
		case *dnsmessage.SRVResource:
			k.where[name] = *body
		case *dnsmessage.TXTResource:
			k.texts[name] = body.TXT
		case *dnsmessage.AResource:
			k.hosts[name] = netip.AddrFrom4(body.A)
		}
	}
}

// found lists the offers whose address is known, each instrument once: by its
// SCPI socket where it announces one.
func (k *known) found() (found []Found) {
	slices.SortStableFunc(k.offers, func(a, b offer) int {
		return slices.Index(services, a.service) - slices.Index(services, b.service)
	})
	seen := map[netip.Addr]bool{}
	for _, o := range k.offers {
		where, ok := k.where[o.name]
		ip, resolved := k.hosts[where.Target.String()]
		if !ok || !resolved || o.service != services[0] && seen[ip] {
			continue
		}
		seen[ip] = true
		port, words := where.Port, k.words(o)
		if o.service != services[0] {
			port = scpiPort
			words += "; it announces no SCPI socket: the port is the usual one"
		}
		found = append(found, Found{Address: "tcp://" + netip.AddrPortFrom(ip, port).String(), Words: words})
	}
	return found
}

// words are the name of an offer, and what its text says of maker and model.
func (k *known) words(o offer) string {
	label := strings.ReplaceAll(strings.TrimSuffix(o.name, "."+o.service), `\ `, " ")
	var says []string
	for _, t := range k.texts[o.name] {
		key, value, _ := strings.Cut(t, "=")
		if slices.Contains([]string{"manufacturer", "model", "serialnumber"}, strings.ToLower(key)) && value != "" {
			says = append(says, value)
		}
	}
	service, _, _ := strings.Cut(o.service, ".")
	words := fmt.Sprintf("%s, announces %s", label, service)
	if len(says) > 0 {
		words += " (" + strings.Join(says, ", ") + ")"
	}
	return words
}
