package scpi

import (
	"strconv"
)

// byteMask is the parameter of *ESE and *SRE.
var byteMask = Numeric{Max: 255, Integer: true}

// registerCommon registers the common commands that IEEE 488.2 requires, and
// the SYSTem headers that SCPI-1999 does.
func (d *Device) registerCommon() {
	s := &d.Status
	d.Get("*IDN", func(*Call) (string, error) { return d.Identity, nil })
	d.Set("*RST", func(*Call) error {
		d.opcAsked = false
		if d.Reset != nil {
			d.Reset()
		}
		return nil
	})
	d.Set("*CLS", func(*Call) error {
		d.opcAsked = false
		d.Queue.Clear()
		s.clear()
		return nil
	})
	d.Set("*ESE", func(c *Call) error { s.ese = byte(c.Int(0)); return nil }, byteMask)
	d.Get("*ESE", func(*Call) (string, error) { return decimal(s.ese), nil })
	d.Get("*ESR", func(*Call) (string, error) { return decimal(s.TakeEvents()), nil })
	d.Set("*SRE", func(c *Call) error { s.sre = byte(c.Int(0)) &^ StatusMSS; return nil }, byteMask)
	d.Get("*SRE", func(*Call) (string, error) { return decimal(s.sre), nil })
	d.Get("*STB", func(*Call) (string, error) { return decimal(d.StatusByte()), nil })
	d.Get("*TST", func(c *Call) (string, error) {
		if d.SelfTest == nil {
			return "0", nil
		}
		return strconv.Itoa(d.SelfTest(c.Context)), nil
	})
	d.Set("*OPC", func(*Call) error {
		d.opcAsked = true
		if d.Pending == nil || !d.Pending() {
			d.Completed()
		}
		return nil
	})
	d.Get("*OPC", func(c *Call) (string, error) { return "1", d.wait(c) })
	d.Set("*WAI", d.wait)
	d.Get("SYSTem:ERRor[:NEXT]", func(*Call) (string, error) { return d.Queue.Next().Error(), nil })
	d.Get("SYSTem:ERRor:COUNt", func(*Call) (string, error) { return strconv.Itoa(d.Queue.Len()), nil })
	d.Get("SYSTem:VERSion", func(*Call) (string, error) { return "1999.0", nil })
}

func (d *Device) wait(c *Call) error {
	if d.Wait == nil {
		return nil
	}
	return d.Wait(c.Context)
}

// StatusByte is what *STB? answers now.
func (d *Device) StatusByte() byte {
	return d.Status.Byte(d.Queue.Len() > 0, d.saying || d.output != nil)
}

func decimal(b byte) string { return strconv.Itoa(int(b)) }

// registerStatus registers the STATus headers that SCPI-1999 requires.
func (d *Device) registerStatus() {
	d.registerRegister("STATus:QUEStionable", &d.Status.Questionable)
	d.registerRegister("STATus:OPERation", &d.Status.Operation)
	d.Set("STATus:PRESet", func(*Call) error {
		d.Status.Questionable.enable, d.Status.Operation.enable = 0, 0
		return nil
	})
}

func (d *Device) registerRegister(header string, r *Register) {
	d.Get(header+"[:EVENt]", func(*Call) (string, error) { return strconv.Itoa(int(r.TakeEvent())), nil })
	d.Get(header+":CONDition", func(*Call) (string, error) { return strconv.Itoa(int(r.condition)), nil })
	d.Set(header+":ENABle", func(c *Call) error { r.enable = uint16(c.Int(0)) & 0x7fff; return nil },
		Numeric{Max: 65535, Integer: true})
	d.Get(header+":ENABle", func(*Call) (string, error) { return strconv.Itoa(int(r.enable)), nil })
}
