package predict

import (
	"math"

	"nightbench/sweeps/internal/numeric"
)

// branch is one way between the common node and the capacitor: a resistance
// and, where nvt > 0, a diode in series with it. r = +Inf: nothing there.
type branch struct {
	r       float64 // Ω, with the diode's own
	is, nvt float64
	shunt   float64 // Ω across the junction, 0: none
	see     float64 // share of a reverse voltage that a shunt leaves to the junction
	rj      float64 // Ω seen by the junction
	lnz     float64 // ln(is·rj/nvt), for current against the diode
	g       float64 // 1/r
}

func newBranch(r float64, d diode) branch {
	b := branch{r: r + d.rs, see: 1}
	if b.r > 0 {
		b.g = 1 / b.r
	}
	if d.is == 0 {
		return b
	}
	b.is, b.nvt, b.shunt = d.is, d.nvt, d.shunt
	if b.shunt > 0 {
		b.see = b.shunt / (b.r + b.shunt)
	}
	b.rj = b.r * b.see
	if b.rj > 0 {
		b.lnz = math.Log(b.is * b.rj / b.nvt)
	}
	return b
}

// farReverse is the reverse voltage, in n·Vt, beyond which a junction carries its saturation current to 1e-13.
const farReverse = 30

// against is the current, and its slope, that flows through the way when w ≥ 0
// stands across it against its diode. Without a diode it is w/r. With one and a
// resistance it is exact by the Wright omega function.
func (b *branch) against(w float64) (i, g float64) {
	if b.nvt == 0 {
		return w * b.g, b.g
	}
	i, g = b.saturation(w * b.see)
	if b.shunt > 0 {
		all := b.r + b.shunt
		i, g = i+(w-b.r*i)/all, g*b.see*b.see+1/all
	}
	return i, g
}

// saturation is the junction's own current against it, w behind rj.
func (b *branch) saturation(w float64) (i, g float64) {
	switch {
	case w > farReverse*b.nvt+b.is*b.rj:
		return b.is, 0
	case b.rj == 0:
		e := b.is * math.Exp(-w/b.nvt)
		return b.is - e, e / b.nvt
	}
	x := b.lnz + (b.is*b.rj-w)/b.nvt
	if x < -12 { // the series of ω in e^x, here to 1e-15
		e := math.Exp(x)
		x = e * (1 - e)
	} else {
		x = numeric.Omega(x)
	}
	return b.is - b.nvt/b.rj*x, x / (1 + x) / b.rj
}
