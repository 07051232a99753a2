package scpi

import (
	"bufio"
	"context"
	"io"
	"net"
	"os"
	"testing"
	"time"

	"github.com/creack/pty"
	"golang.org/x/term"

	"nightbench/instruments/link"
)

// mostRatio is how many bare round trips an exchange may cost.
const mostRatio = 3.5

// answerer serves a stream as the smallest instrument there can be.
func answerer(rw io.ReadWriter) {
	for in := bufio.NewScanner(rw); in.Scan(); {
		reply := "1\n"
		if in.Text() == "*IDN?" {
			reply = self + "\n"
		}
		if _, err := io.WriteString(rw, reply); err != nil {
			return
		}
	}
}

// roundTrips writes a line and reads one back on a stream, with nothing in between.
func roundTrips(b *testing.B, rw io.ReadWriter, n int) time.Duration {
	b.Helper()
	line, reply := []byte("READ?\n"), make([]byte, 64)
	begun := time.Now()
	for range n {
		if _, err := rw.Write(line); err != nil {
			b.Fatal(err)
		}
		for got := 0; got == 0 || reply[got-1] != '\n'; {
			m, err := rw.Read(reply[got:])
			if err != nil {
				b.Fatal(err)
			}
			got += m
		}
	}
	return time.Since(begun)
}

// exchanged is the same through a link and a connection.
func exchanged(b *testing.B, c *Conn, n int) time.Duration {
	b.Helper()
	begun := time.Now()
	for range n {
		if _, err := c.Query(context.Background(), "READ?"); err != nil {
			b.Fatal(err)
		}
	}
	return time.Since(begun)
}

// rounds is how many exchanges one lot has; lots of both kinds alternate, so
// that what else the computer does weighs on both.
const rounds = 200

// against reports exchanges a second and their cost in bare round trips.
func against(b *testing.B, plain io.ReadWriter, c *Conn) {
	b.Helper()
	roundTrips(b, plain, 50)
	exchanged(b, c, 50) // proves it in step
	var bareTook, took time.Duration
	lots := 0
	for b.Loop() {
		bareTook += roundTrips(b, plain, rounds)
		took += exchanged(b, c, rounds)
		lots++
	}
	ratio := float64(took) / float64(bareTook)
	b.ReportMetric(float64(lots*rounds)/took.Seconds(), "exchanges/s")
	b.ReportMetric(float64(lots*rounds)/bareTook.Seconds(), "bare/s")
	b.ReportMetric(ratio, "×bare")
	b.ReportMetric(0, "ns/op")
	if ratio > mostRatio && lots > 3 {
		b.Errorf("an exchange costs %.2f bare round trips, at most %.1f are allowed", ratio, mostRatio)
	}
}

func connection(b *testing.B, address string) *Conn {
	b.Helper()
	a, err := link.Parse(address)
	if err != nil {
		b.Fatal(err)
	}
	l, err := link.Open(b.Context(), a, link.Options{})
	if err != nil {
		b.Fatal(err)
	}
	b.Cleanup(func() { l.Close() })
	return New(l, Options{})
}

func BenchmarkExchange(b *testing.B) {
	b.Run("TCP", func(b *testing.B) {
		ln, err := net.Listen("tcp", "127.0.0.1:0")
		if err != nil {
			b.Fatal(err)
		}
		b.Cleanup(func() { ln.Close() })
		go func() {
			for {
				c, err := ln.Accept()
				if err != nil {
					return
				}
				go func() { answerer(c); c.Close() }()
			}
		}()
		plain, err := net.Dial("tcp", ln.Addr().String())
		if err != nil {
			b.Fatal(err)
		}
		b.Cleanup(func() { plain.Close() })
		against(b, plain, connection(b, "tcp://"+ln.Addr().String()))
	})
	b.Run("PTY", func(b *testing.B) {
		name := onTerminal(b)
		plain, err := os.OpenFile(onTerminal(b), os.O_RDWR, 0)
		if err != nil {
			b.Fatal(err)
		}
		b.Cleanup(func() { plain.Close() })
		against(b, plain, connection(b, "serial://"+name))
	})
}

// onTerminal serves a pseudo-terminal of its own and gives its name.
func onTerminal(b *testing.B) string {
	b.Helper()
	master, slave, err := pty.Open()
	if err != nil {
		b.Fatal(err)
	}
	if _, err := term.MakeRaw(int(slave.Fd())); err != nil {
		b.Fatal(err)
	}
	done := make(chan struct{})
	go func() { defer close(done); answerer(master) }()
	b.Cleanup(func() { slave.Close(); <-done; master.Close() }) // the last side that closes ends the reading
	return slave.Name()
}
