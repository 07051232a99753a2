package predict

import "math"

const (
	boltzmann  = 1.380649e-23    // J/K, exact since 2019
	elementary = 1.602176634e-19 // C, exact since 2019
	reference  = Reference + 273.15
	copper     = 0.0039 // 1/K
	channel    = 0.004  // 1/K of on-resistance: 18.4 mΩ at 25 °C, 25 → 36 mΩ at 125 °C (AO3404A sheet)
	junction   = -0.002 // V/K of a base-emitter voltage
)

// warm brings parts to a temperature: junctions by the saturation law of circuit
// simulators, which for silicon comes to −2 mV/K and for a Schottky barrier to
// leakage that doubles every 10 K; copper by 0.39 %/K.
func (m *Model) warm(p *parts, kelvin float64) {
	vt := boltzmann * kelvin / elementary
	p.chargeDiode.warm(kelvin, vt)
	p.dischargeDiode.warm(kelvin, vt)
	p.fb.warm(kelvin, vt)
	p.switchPart.vt = vt
	p.switchPart.rdsHeat = 1
	if kelvin == reference {
		return
	}
	dt := kelvin - reference
	p.timer.dropShift = m.rated.timer.DropPerKelvin * dt
	if len(m.board.Timer.Drop) > 0 {
		p.timer.dropShift = 0
	}
	p.switchPart.vbe += junction * dt
	p.switchPart.rdsHeat += channel * dt
	if p.load.k > 0 {
		p.load.r *= 1 + copper*dt
	}
}

func (d *diode) warm(kelvin, vt float64) {
	d.nvt = d.n * vt
	if d.is == 0 || kelvin == reference {
		return
	}
	x := kelvin / reference
	d.is *= math.Exp((x-1)*d.eg/d.nvt + d.xti/d.n*math.Log(x))
}
