package drivertest

// CPX400DP speaks in words of its own (CPX200D manual p. 28): settings answer
// with their word in front, measured values with their unit, LSR1? bit 2 is an
// over-voltage trip and reading clears it, TRIPRST clears the trip.
func CPX400DP() *MakerSupply {
	s := newMakerSupply(2, "\r\n")
	s.says(`\*IDN\?`, "THURLBY THANDAR, CPX400DP, 123456, 1.08")
	s.says(`\*OPC\?`, "1")
	s.takes(`\*CLS|LOCAL`)
	s.on(`V([12]) `+num, func(p []string) string { s.at(p[1]).Volts = number(p[2]); return "" })
	s.on(`V([12])\?`, func(p []string) string { return "V" + p[1] + " " + fixed(2, s.at(p[1]).Volts) })
	s.on(`I([12]) `+num, func(p []string) string { s.at(p[1]).Limit = number(p[2]); return "" })
	s.on(`I([12])\?`, func(p []string) string { return "I" + p[1] + " " + fixed(3, s.at(p[1]).Limit) })
	s.on(`OVP([12]) `+num, func(p []string) string { s.at(p[1]).Over, s.at(p[1]).Armed = number(p[2]), true; return "" })
	s.on(`OVP([12])\?`, func(p []string) string { return "VP" + p[1] + " " + fixed(1, s.at(p[1]).Over) })
	s.on(`OP([12]) ([01])`, func(p []string) string { s.at(p[1]).On = p[2] == "1"; return "" })
	s.on(`OP([12])\?`, func(p []string) string { s.at(p[1]).look(); return word("1", "0", s.at(p[1]).On) })
	s.on(`LSR([12])\?`, func(p []string) string { s.at(p[1]).look(); return word("4", "1", s.at(p[1]).TrippedOver) })
	s.on(`TRIPRST`, func([]string) string {
		for _, o := range s.Out {
			o.clear(false)
		}
		return ""
	})
	s.on(`V([12])O\?`, func(p []string) string { v, _ := s.at(p[1]).look(); return fixed(2, v) + "V" })
	s.on(`I([12])O\?`, func(p []string) string { _, i := s.at(p[1]).look(); return fixed(3, i) + "A" })
	return s
}
