package drivertest

import "fmt"

// Odd is a supply that no maker makes, with manners that the makers' supplies
// here have not: it echoes, names its channels, answers several values at once,
// its state as text of bits, and has words for what it can't measure.
func Odd() *MakerSupply {
	s := newMakerSupply(2, "\n")
	s.Echo = true
	q := &queue{none: "NONE"}
	s.unknown = func(m string) { q.push("12 what is " + m) }
	at := func(name string) *Output { return s.Out[map[string]int{"P6V": 0, "N25V": 1}[name]] }
	const name = `(P6V|N25V)`
	s.says(`WHO\?`, "GROWHOUSE ODD V2.1")
	s.on(`FAULT\?`, q.next)
	s.on(`SWITCH `+name+` ([01])`, func(p []string) string { at(p[1]).On = p[2] == "1"; return "" })
	s.on(`STATE\? `+name, func(p []string) string { return "00" + word("1", "0", at(p[1]).On) + "01" })
	s.on(`SET `+name+` U `+num, func(p []string) string { at(p[1]).Volts = number(p[2]); return "" })
	s.on(`SET `+name+` I `+num, func(p []string) string { at(p[1]).Limit = number(p[2]); return "" })
	s.on(`SET\? `+name, func(p []string) string {
		return fmt.Sprintf("%s,%.3fV,%.0fmA", p[1], at(p[1]).Volts, 1e3*at(p[1]).Limit)
	})
	s.on(`READ\? `+name, func(p []string) string {
		v, i := at(p[1]).look()
		volts, amperes := fmt.Sprintf("%.3fV", v), fmt.Sprintf("%.4fA", i)
		if v > 6 {
			volts = "over"
		}
		if !at(p[1]).On {
			amperes = "--"
		}
		return "READ " + p[1] + ": " + volts + " / " + amperes
	})
	return s
}
