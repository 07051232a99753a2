package drivertest

import (
	"math"
	"strconv"
	"sync"
	"time"

	"nightbench/instruments/scpi"
)

// Meter is a multimeter on a steady input.
type Meter struct {
	Listener

	mu       sync.Mutex // guards what follows
	volts    float64
	amperes  float64
	function string // VOLT or CURR
	ranges   map[string]float64
	nplc     map[string]float64
}

var (
	meterRanges = map[string][]float64{"VOLT": {0.1, 1, 10, 100, 1000}, "CURR": {0.01, 0.1, 1, 3}}
	meterSpeeds = []float64{0.02, 0.2, 1, 10, 100}
)

// NewMeter makes a meter that has just been switched on.
func NewMeter() *Meter {
	m := &Meter{}
	d := scpi.NewDevice("Nightbench,practice-meter,T2,1.0", 20)
	d.Status.TakeEvents()
	m.Device, d.Reset = d, m.PowerOn
	m.PowerOn()
	d.Set("[SENSe:]FUNCtion", m.choose, scpi.Text{})
	d.Get("[SENSe:]FUNCtion", func(*scpi.Call) (string, error) { return scpi.FormatString(m.function + ":DC"), nil })
	for word, header := range map[string]string{"VOLT": "[SENSe:]VOLTage[:DC]", "CURR": "[SENSe:]CURRent[:DC]"} {
		m.next(header+":RANGe[:UPPer]", word, m.ranges, meterRanges[word])
		m.next(header+":NPLCycles", word, m.nplc, meterSpeeds)
	}
	d.Get("READ", m.read)
	return m
}

// PowerOn forgets all settings.
func (m *Meter) PowerOn() {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.function = "VOLT"
	if m.ranges == nil {
		m.ranges, m.nplc = map[string]float64{}, map[string]float64{}
	}
	m.ranges["VOLT"], m.ranges["CURR"] = 1000, 3
	m.nplc["VOLT"], m.nplc["CURR"] = 10, 10
}

func (m *Meter) choose(c *scpi.Call) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	switch c.Text(0) {
	case "VOLT:DC", "VOLT":
		m.function = "VOLT"
	case "CURR:DC", "CURR":
		m.function = "CURR"
	default:
		return scpi.NewFault(scpi.IllegalParameter, c.Text(0))
	}
	return nil
}

// next registers a setting that goes to the next value up of a list.
func (m *Meter) next(header, word string, in map[string]float64, list []float64) {
	m.Device.Set(header, func(c *scpi.Call) error {
		m.mu.Lock()
		defer m.mu.Unlock()
		for _, v := range list {
			if v >= c.Number(0)*(1-1e-9) {
				in[word] = v
				return nil
			}
		}
		return scpi.NewFault(scpi.DataOutOfRange, header)
	}, scpi.Numeric{Max: 1e6})
	m.Device.Get(header, func(*scpi.Call) (string, error) {
		m.mu.Lock()
		defer m.mu.Unlock()
		return strconv.FormatFloat(in[word], 'g', 6, 64), nil
	})
}

// read takes two apertures of a 50 Hz line, then answers.
func (m *Meter) read(*scpi.Call) (string, error) {
	m.mu.Lock()
	function := m.function
	full, aperture := m.ranges[function], m.nplc[function]/50
	m.mu.Unlock()
	time.Sleep(time.Duration(2 * aperture * float64(time.Second)))
	m.mu.Lock()
	defer m.mu.Unlock()
	v := map[string]float64{"VOLT": m.volts, "CURR": m.amperes}[function]
	if math.Abs(v) > 1.2*full {
		return scpi.NR3(math.Copysign(9.9e37, v)), nil
	}
	return scpi.NR3(v), nil
}

// Input puts a voltage and a current on its terminals.
func (m *Meter) Input(volts, amperes float64) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.volts, m.amperes = volts, amperes
}
