package practice

import (
	"bytes"
	"math/rand/v2"
	"slices"
	"strconv"
	"time"
)

// blemish is what is wrong with one reply.
type blemish struct {
	out  []byte
	wait time.Duration // wall
}

// spoil applies the faults of an instrument's wire to one reply, in the order they came.
func (b *Bench) spoil(name string, reply []byte) blemish {
	b.faults.mu.Lock()
	defer b.faults.mu.Unlock()
	s := blemish{out: reply}
	for _, f := range b.faults.all {
		if f.On == name && s.by(f, &b.faults.noise) {
			f.used++
		}
	}
	b.faults.all = slices.DeleteFunc(b.faults.all, func(f *inForce) bool { return f.Times > 0 && f.used >= f.Times })
	return s
}

// by applies one fault and tells whether it made a difference.
func (s *blemish) by(f *inForce, r *noise) bool {
	n := len(s.out)
	if n == 0 {
		return false
	}
	switch f.Kind {
	case Silence:
		s.out = nil
	case Late:
		s.wait += time.Duration(f.Size * float64(time.Second))
	case Twice:
		s.out = slices.Concat(s.out, s.out)
	case Truncated:
		s.out = s.out[:n/2]
	case WrongCount:
		return s.miscount(int(f.Size))
	case Garbage:
		s.out = slices.Insert(slices.Clone(s.out), n/2, r.bytes(int(f.Size))...)
	case StrayCR:
		s.out = slices.Concat([]byte{'\r'}, bytes.TrimSuffix(s.out, []byte{'\n'}), []byte("\r\n"))
	case StrayLF:
		s.out = append(slices.Clone(s.out), '\n')
	default:
		return false
	}
	return true
}

// miscount changes the count of a definite-length block by more bytes.
func (s *blemish) miscount(more int) bool {
	if len(s.out) < 3 || s.out[0] != '#' || s.out[1] < '1' || s.out[1] > '9' {
		return false
	}
	digits := int(s.out[1] - '0')
	count, err := strconv.Atoi(string(s.out[2 : 2+digits]))
	if err != nil {
		return false
	}
	text := strconv.Itoa(count + more)
	s.out = slices.Concat([]byte{'#', '0' + byte(len(text))}, []byte(text), s.out[2+digits:])
	return true
}

// noise makes what interference looks like on a serial line: bytes with the high bit set.
type noise struct{ *rand.Rand }

func (n noise) bytes(count int) []byte {
	b := make([]byte, count)
	for i := range b {
		b[i] = 0x80 | byte(n.IntN(128))
	}
	return b
}

// echoes tells whether a message is echoed; says is what an intruder asks just then.
func (b *Bench) heard(name string) (echo bool, says []string) {
	b.faults.mu.Lock()
	defer b.faults.mu.Unlock()
	for _, f := range b.faults.all {
		if f.On != name {
			continue
		}
		switch f.Kind {
		case Echo:
			echo = true
		case Intruder:
			says = append(says, f.Says)
		default:
			continue
		}
		f.used++
	}
	b.faults.all = slices.DeleteFunc(b.faults.all, func(f *inForce) bool { return f.Times > 0 && f.used >= f.Times })
	return echo, says
}
