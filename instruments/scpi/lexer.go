package scpi

import (
	"bytes"
	"strconv"
	"strings"
)

// Unit is one program message unit: a header and its parameters.
type Unit struct {
	Common bool     // starts with *
	Rooted bool     // starts with :
	Query  bool     // ends with ?
	Nodes  []string // mnemonics in capitals, without * : ?
	Params []Param
}

// String is the header as a listener understood it.
func (u Unit) String() string {
	s := strings.Join(u.Nodes, ":")
	if u.Common {
		s = "*" + s
	}
	if u.Query {
		s += "?"
	}
	return s
}

// Parser takes a program message apart, unit by unit, by the grammar of IEEE
// 488.2 section 7 (from memory, and as restated in HP 1650B Programming
// Reference A-6). It stops at the first error: the units before it count.
type Parser struct {
	msg []byte
	pos int
}

// NewParser parses one message without its terminator.
func NewParser(message []byte) *Parser { return &Parser{msg: message} }

// maxMnemonic is the longest mnemonic, character data or suffix in characters
// (IEEE 488.2 7.6.1.4; Agilent 8712ET ch. 13: else -112, -144, -134).
const maxMnemonic = 12

func isSpace(c byte) bool  { return c <= ' ' && c != '\n' }
func isDigit(c byte) bool  { return c >= '0' && c <= '9' }
func isAlpha(c byte) bool  { return c|0x20 >= 'a' && c|0x20 <= 'z' }
func isWord(c byte) bool   { return isAlpha(c) || isDigit(c) || c == '_' }
func isSuffix(c byte) bool { return isAlpha(c) || isDigit(c) || c == '/' || c == '.' || c == '-' }

// peek is the next byte, 0 at the end; a 0 within a message counts as space
// before anybody looks at it.
func (p *Parser) peek() byte {
	if p.pos < len(p.msg) {
		return p.msg[p.pos]
	}
	return 0
}

func (p *Parser) end() bool { return p.pos >= len(p.msg) }

func (p *Parser) spaces() {
	for !p.end() && isSpace(p.msg[p.pos]) {
		p.pos++
	}
}

// while takes the bytes that satisfy is.
func (p *Parser) while(is func(byte) bool) string {
	start := p.pos
	for !p.end() && is(p.msg[p.pos]) {
		p.pos++
	}
	return string(p.msg[start:p.pos])
}

// Next parses the next unit; ok is false at the end of the message. Empty
// units are skipped. The error is a Fault.
func (p *Parser) Next() (u Unit, ok bool, err error) {
	for p.spaces(); p.peek() == ';'; p.spaces() {
		p.pos++
	}
	if p.end() {
		return u, false, nil
	}
	if u, err = p.header(); err != nil {
		return u, false, err
	}
	if u.Params, err = p.params(); err != nil {
		return u, false, err
	}
	return u, true, nil
}

// header parses up to the white space, separator or end after the header.
func (p *Parser) header() (u Unit, err error) {
	if c := p.peek(); !isAlpha(c) && c != ':' && c != '*' {
		return u, p.unexpected(SyntaxError)
	}
	switch p.peek() {
	case '*':
		u.Common = true
		p.pos++
	case ':':
		u.Rooted = true
		p.pos++
	}
	for {
		word := p.while(isWord)
		switch {
		case word == "" || !isAlpha(word[0]):
			return u, p.unexpected(SyntaxError)
		case len(word) > maxMnemonic:
			return u, NewFault(MnemonicTooLong, word)
		}
		u.Nodes = append(u.Nodes, strings.ToUpper(word))
		if p.peek() != ':' || u.Common {
			break
		}
		p.pos++
	}
	if p.peek() == '?' {
		u.Query = true
		p.pos++
	}
	if p.end() || p.peek() == ';' || isSpace(p.peek()) {
		return u, nil
	}
	if p.peek() == ',' {
		return u, NewFault(InvalidSeparator, u.String())
	}
	return u, p.unexpected(HeaderSeparatorError)
}

// unexpected is the fault for a byte that must not stand here: code, if the
// byte belongs to the language at all, else "invalid character".
func (p *Parser) unexpected(code int) Fault {
	if c := p.peek(); !p.end() && !isWord(c) && !isSpace(c) && !strings.ContainsRune(`:*?;,"'#()+-./`, rune(c)) {
		return NewFault(InvalidCharacter, strconv.QuoteToASCII(string(p.msg[p.pos:p.pos+1])))
	}
	return NewFault(code, "")
}

// params parses the parameters of a unit and the separator after it.
func (p *Parser) params() (params []Param, err error) {
	p.spaces()
	if p.end() || p.peek() == ';' {
		return nil, nil
	}
	for {
		p.spaces()
		param, err := p.param()
		if err != nil {
			return nil, err
		}
		params = append(params, param)
		p.spaces()
		switch {
		case p.end() || p.peek() == ';':
			return params, nil
		case p.peek() != ',':
			return nil, p.unexpected(InvalidSeparator)
		}
		p.pos++
	}
}

// Splitter cuts a stream into program messages at NL, taking care of blocks,
// whose bytes may be anything. A message longer than Limit is thrown away.
type Splitter struct {
	Limit int // bytes; 0 means 1 MiB
	buf   []byte
	from  int  // scanned so far
	quote byte // the quote that is open at from
	drop  bool // the message in hand is too long
}

// Feed adds received bytes.
func (s *Splitter) Feed(data []byte) { s.buf = append(s.buf, data...) }

// Reset forgets what was received, as a device clear does.
func (s *Splitter) Reset() { *s = Splitter{Limit: s.Limit} }

// Next takes the next whole message, without its NL; ok is false when there
// is none yet. The error is an InputOverrun Fault for a message thrown away.
func (s *Splitter) Next() (message []byte, ok bool, err error) {
	for s.from < len(s.buf) {
		skip, wait := s.block()
		if wait {
			break
		}
		c := s.buf[s.from]
		s.from += 1 + skip
		switch {
		case c == '\n':
			return s.cut()
		case s.quote != 0 && c == s.quote:
			s.quote = 0
		case s.quote == 0 && (c == '"' || c == '\''):
			s.quote = c
		}
	}
	if s.limit() < len(s.buf) {
		s.drop, s.buf, s.from, s.quote = true, nil, 0, 0
	}
	return nil, false, nil
}

func (s *Splitter) limit() int {
	if s.Limit > 0 {
		return s.Limit
	}
	return 1 << 20
}

// cut takes the message that ends just before from.
func (s *Splitter) cut() ([]byte, bool, error) {
	message, dropped := s.buf[:s.from-1], s.drop || s.from-1 > s.limit()
	s.buf, s.from, s.quote, s.drop = bytes.Clone(s.buf[s.from:]), 0, 0, false
	if dropped {
		return nil, true, NewFault(InputOverrun, "")
	}
	return message, true, nil
}

// block says how many bytes after the one at from belong to a block that
// begins there, and whether more must be received to know or to have them.
func (s *Splitter) block() (skip int, wait bool) {
	b := s.buf[s.from:]
	if b[0] != '#' || s.quote != 0 || s.from == 0 || !isSpace(s.buf[s.from-1]) && s.buf[s.from-1] != ',' {
		return 0, false
	}
	if len(b) < 2 {
		return 0, true
	}
	n := int(b[1]) - '0'
	if n < 1 || n > 9 {
		return 0, false
	}
	digits := b[2:min(2+n, len(b))]
	if bytes.ContainsFunc(digits, func(r rune) bool { return r < '0' || r > '9' }) {
		return 0, false
	}
	if len(digits) < n {
		return 0, true
	}
	count, err := strconv.Atoi(string(digits))
	if err != nil || count > s.limit() {
		return 0, false
	}
	skip = 1 + n + count
	return skip, len(b) < 1+skip
}
