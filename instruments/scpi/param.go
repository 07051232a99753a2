package scpi

import (
	"math"
	"strconv"
	"strings"
)

// Kind is the form of a parameter.
type Kind int

// The forms of IEEE 488.2 section 7.7.
const (
	Character Kind = iota
	Decimal
	NonDecimal
	Quoted
	Block
	Expression
)

// Param is one parameter as sent.
type Param struct {
	Kind   Kind
	Text   string  // character data in capitals; a string or an expression without its quotes or brackets; a number as sent
	Value  float64 // of a number, without the suffix
	Suffix string  // of a decimal number, in capitals
	Bytes  []byte  // of a block
}

// param parses one parameter.
func (p *Parser) param() (Param, error) {
	switch c := p.peek(); {
	case p.end():
		return Param{}, NewFault(SyntaxError, "")
	case isAlpha(c):
		return p.character()
	case isDigit(c) || c == '+' || c == '-' || c == '.':
		return p.decimal()
	case c == '"' || c == '\'':
		return p.quoted(c)
	case c == '#':
		return p.hash()
	case c == '(':
		return p.expression()
	}
	return Param{}, p.unexpected(SyntaxError)
}

func (p *Parser) character() (Param, error) {
	word := p.while(isWord)
	if len(word) > maxMnemonic {
		return Param{}, NewFault(CharacterTooLong, word)
	}
	if c := p.peek(); !p.end() && !isSpace(c) && c != ',' && c != ';' {
		return Param{}, NewFault(InvalidCharacterData, word)
	}
	return Param{Kind: Character, Text: strings.ToUpper(word)}, nil
}

// quoted parses a string; the quote in use is doubled inside.
func (p *Parser) quoted(quote byte) (Param, error) {
	var text strings.Builder
	for p.pos++; !p.end(); p.pos++ {
		c := p.peek()
		if c == quote {
			p.pos++
			if p.peek() != quote || p.end() {
				return Param{Kind: Quoted, Text: text.String()}, nil
			}
		}
		text.WriteByte(c)
	}
	return Param{}, NewFault(InvalidString, "")
}

// expression parses up to the matching bracket.
func (p *Parser) expression() (Param, error) {
	start, depth := p.pos+1, 0
	for ; !p.end(); p.pos++ {
		switch p.peek() {
		case '(':
			depth++
		case ')':
			depth--
		case ';', '"', '\'', '#':
			return Param{}, NewFault(InvalidExpression, "")
		}
		if depth == 0 {
			p.pos++
			return Param{Kind: Expression, Text: string(p.msg[start : p.pos-1])}, nil
		}
	}
	return Param{}, NewFault(InvalidExpression, "")
}

// hash parses what begins with #: a block or a number in base 16, 8 or 2.
func (p *Parser) hash() (Param, error) {
	p.pos++
	c := p.peek()
	p.pos++
	switch {
	case c == '0':
		b := p.msg[p.pos:]
		p.pos = len(p.msg)
		return Param{Kind: Block, Bytes: b}, nil
	case isDigit(c):
		return p.block(int(c - '0'))
	}
	base := map[byte]int{'H': 16, 'Q': 8, 'B': 2}[c&^0x20]
	if base == 0 {
		return Param{}, NewFault(InvalidBlock, "")
	}
	digits := p.while(isWord)
	v, err := strconv.ParseUint(digits, base, 64)
	if err != nil {
		return Param{}, NewFault(InvalidInNumber, digits)
	}
	return Param{Kind: NonDecimal, Text: "#" + string(c) + digits, Value: float64(v)}, nil
}

func (p *Parser) block(n int) (Param, error) {
	digits := string(p.msg[p.pos:min(p.pos+n, len(p.msg))])
	count, err := strconv.ParseUint(digits, 10, 31)
	from := p.pos + n
	if err != nil || len(digits) < n || int(count) > len(p.msg)-from {
		return Param{}, NewFault(InvalidBlock, "")
	}
	p.pos = from + int(count)
	return Param{Kind: Block, Bytes: p.msg[from:p.pos]}, nil
}

// The bounds of a decimal number: digits of the mantissa without leading
// zeros, and magnitude of the exponent (Agilent 8712ET ch. 13).
const (
	maxDigits   = 255
	maxExponent = 32000
)

// decimal parses an NRf number and its suffix. White space may stand before
// and after the E of an exponent, and before a suffix.
func (p *Parser) decimal() (Param, error) {
	mantissa := p.while(func(c byte) bool { return isDigit(c) || strings.IndexByte("+-.", c) >= 0 })
	if decimalPrefix(mantissa) != mantissa || mantissa == "" {
		return Param{}, NewFault(InvalidInNumber, mantissa)
	}
	digits := strings.TrimLeft(strings.ReplaceAll(strings.TrimLeft(mantissa, "+-"), ".", ""), "0")
	if len(digits) > maxDigits {
		return Param{}, NewFault(TooManyDigits, "")
	}
	exponent, err := p.exponent()
	if err != nil {
		return Param{}, err
	}
	text := mantissa + exponent
	value, err := strconv.ParseFloat(text, 64)
	if err != nil && !math.IsInf(value, 0) {
		return Param{}, NewFault(InvalidInNumber, text)
	}
	suffix, err := p.suffix()
	return Param{Kind: Decimal, Text: text, Value: value, Suffix: suffix}, err
}

// exponent parses E and its digits, or nothing when the E begins a suffix.
func (p *Parser) exponent() (string, error) {
	back := p.pos
	p.spaces()
	if p.peek()&^0x20 != 'E' {
		p.pos = back
		return "", nil
	}
	p.pos++
	p.spaces()
	sign := ""
	if c := p.peek(); c == '+' || c == '-' {
		sign = string(c)
		p.pos++
	}
	digits := p.while(isDigit)
	if digits == "" && sign == "" {
		p.pos = back
		return "", nil
	}
	size, err := strconv.Atoi(digits)
	switch {
	case digits == "":
		return "", NewFault(InvalidInNumber, "")
	case err != nil || size > maxExponent:
		return "", NewFault(ExponentTooLarge, "")
	}
	return "E" + sign + digits, nil
}

// suffix parses the unit after a number.
func (p *Parser) suffix() (string, error) {
	back := p.pos
	p.spaces()
	if c := p.peek(); !isAlpha(c) && c != '/' {
		glued := p.pos == back && !p.end() && c != ',' && c != ';'
		p.pos = back
		if glued {
			return "", p.unexpected(InvalidInNumber)
		}
		return "", nil
	}
	suffix := p.while(isSuffix)
	if len(suffix) > maxMnemonic {
		return "", NewFault(SuffixTooLong, suffix)
	}
	return strings.ToUpper(suffix), nil
}
