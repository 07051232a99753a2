// Package si holds units and quantities: it parses them as people write them
// ("4k7 1%", "250 ms", "0.5 g cm2") and prints them as the trade does
// (4.352(12) V). Values are SI, float64. It imports nothing of ours.
package si

// Unit is the symbol of an SI unit, as shown to people and stored with every number.
type Unit string

// The units in use. One is the unit of plain ratios.
const (
	One            Unit = "1"
	Volt           Unit = "V"
	Ampere         Unit = "A"
	Ohm            Unit = "Ω"
	Farad          Unit = "F"
	Henry          Unit = "H"
	Second         Unit = "s"
	Hertz          Unit = "Hz"
	Watt           Unit = "W"
	Celsius        Unit = "°C"
	RadianPerSec   Unit = "rad/s"
	VoltSecPerRad  Unit = "V s/rad"
	NewtonMetre    Unit = "N m"
	NewtonMetreSec Unit = "N m s"
	NewtonMetreSq  Unit = "N m s2"
	KilogramMetre2 Unit = "kg m2"
)

// spelling is one way to write a unit: its text, the factor to SI, and whether
// a decimal prefix may stand before it.
type spelling struct {
	text     string
	factor   float64
	prefixed bool
}

// A dimension names a kind of quantity at compile time, so that a voltage can't be given where a current is meant.
type dimension interface{ spec() spec }

// spec says how a dimension is written. bare is true where a number without a
// unit is taken: resistance, capacitance, inductance and plain ratios only.
type spec struct {
	unit  Unit
	kind  string // for messages: "a voltage"
	like  string // an example, for messages
	bare  bool
	spell []spelling
}

type (
	volt           struct{}
	ampere         struct{}
	ohm            struct{}
	farad          struct{}
	henry          struct{}
	second         struct{}
	hertz          struct{}
	watt           struct{}
	one            struct{}
	celsius        struct{}
	voltSecPerRad  struct{}
	newtonMetre    struct{}
	newtonMetreSec struct{}
	newtonMetreSq  struct{}
	kilogramMetre2 struct{}
)

func (volt) spec() spec {
	return spec{Volt, "a voltage", "9 V", false, []spelling{{"V", 1, true}}}
}
func (ampere) spec() spec {
	return spec{Ampere, "a current", "250 mA", false, []spelling{{"A", 1, true}}}
}
func (ohm) spec() spec {
	return spec{Ohm, "a resistance", "4k7", true, []spelling{{"Ω", 1, true}, {"Ω", 1, true}, {"ohm", 1, true}, {"Ohm", 1, true}, {"R", 1, false}}}
}
func (farad) spec() spec {
	return spec{Farad, "a capacitance", "100n", true, []spelling{{"F", 1, true}}}
}
func (henry) spec() spec {
	return spec{Henry, "an inductance", "5 mH", true, []spelling{{"H", 1, true}}}
}
func (second) spec() spec {
	return spec{Second, "a time", "250 ms", false, []spelling{{"s", 1, true}, {"min", 60, false}, {"h", 3600, false}}}
}
func (hertz) spec() spec {
	return spec{Hertz, "a frequency", "1.2 kHz", false, []spelling{{"Hz", 1, true}}}
}
func (watt) spec() spec {
	return spec{Watt, "a power", "2 W", false, []spelling{{"W", 1, true}}}
}
func (one) spec() spec {
	return spec{One, "a ratio", "25 %", true, []spelling{{"%", 1e-2, false}, {"ppm", 1e-6, false}}}
}
func (celsius) spec() spec {
	return spec{Celsius, "a temperature", "27 degC", false, []spelling{{"degC", 1, false}, {"°C", 1, false}}}
}
func (voltSecPerRad) spec() spec {
	return spec{VoltSecPerRad, "a torque constant", "8 mV s/rad", false, []spelling{{"V s/rad", 1, true}, {"N m/A", 1, true}}}
}
func (newtonMetre) spec() spec {
	return spec{NewtonMetre, "a torque", "0.4 mN m", false, []spelling{{"N m", 1, true}}}
}
func (newtonMetreSec) spec() spec {
	return spec{NewtonMetreSec, "a viscous torque", "0.2 uN m s", false, []spelling{{"N m s", 1, true}, {"N m s/rad", 1, true}}}
}
func (newtonMetreSq) spec() spec {
	return spec{NewtonMetreSq, "a quadratic torque", "0.3 nN m s2", false, []spelling{{"N m s2", 1, true}, {"N m s2/rad2", 1, true}}}
}
func (kilogramMetre2) spec() spec {
	return spec{KilogramMetre2, "an inertia", "0.5 g cm2", false, []spelling{{"kg m2", 1, false}, {"g cm2", 1e-7, true}, {"g m2", 1e-3, true}}}
}
