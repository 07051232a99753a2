package scpi

// Bits of the standard event status register (IEEE 488.2 section 11.5.1, as
// restated in Keithley 2182A app. H).
const (
	EventOPC = 1 << iota // operation complete
	EventRQC             // request control
	EventQYE             // query error
	EventDDE             // device-dependent error
	EventEXE             // execution error
	EventCME             // command error
	EventURQ             // user request
	EventPON             // power on
)

// Bits of the status byte (IEEE 488.2 section 11.2 and SCPI-1999 volume 1
// section 9, as restated in Xantrex XDC app. B).
const (
	StatusEAV  = 1 << 2 // error queue not empty
	StatusQUES = 1 << 3 // questionable summary
	StatusMAV  = 1 << 4 // output queue not empty
	StatusESB  = 1 << 5 // event status summary
	StatusMSS  = 1 << 6 // master summary
	StatusOPER = 1 << 7 // operation summary
)

// Register is a SCPI status register of 15 bits: conditions that hold, events
// that a condition began, and which events show in the summary.
type Register struct {
	condition, event, enable uint16
}

// SetCondition sets the conditions that hold; those that begin latch events.
func (r *Register) SetCondition(bits uint16) {
	bits &= 0x7fff
	r.event |= bits &^ r.condition
	r.condition = bits
}

// TakeEvent reads and clears the events.
func (r *Register) TakeEvent() uint16 {
	e := r.event
	r.event = 0
	return e
}

func (r *Register) summary() bool { return r.event&r.enable != 0 }

// Status holds the status registers of an instrument.
type Status struct {
	Questionable, Operation Register

	esr, ese, sre byte
}

// Raise sets bits of the standard event status register.
func (s *Status) Raise(bits byte) { s.esr |= bits }

// TakeEvents reads and clears the standard event status register.
func (s *Status) TakeEvents() byte {
	e := s.esr
	s.esr = 0
	return e
}

// clear empties the event registers; masks and conditions stay.
func (s *Status) clear() {
	s.esr = 0
	s.Questionable.event, s.Operation.event = 0, 0
}

// Byte is the status byte as *STB? answers it, given whether there are errors
// and output.
func (s *Status) Byte(errors, output bool) byte {
	var b byte
	for _, on := range []struct {
		is  bool
		bit byte
	}{
		{errors, StatusEAV}, {s.Questionable.summary(), StatusQUES}, {output, StatusMAV},
		{s.esr&s.ese != 0, StatusESB}, {s.Operation.summary(), StatusOPER},
	} {
		if on.is {
			b |= on.bit
		}
	}
	if b&s.sre&^StatusMSS != 0 {
		b |= StatusMSS
	}
	return b
}

// eventFor is the event bit of an error class (GW Instek PSU programming
// manual p. 135: -1xx CME, -2xx EXE, -3xx and positive DDE, -4xx QYE; -5xx to
// -8xx from memory of SCPI-1999).
func eventFor(code int) byte {
	if code > 0 {
		return EventDDE
	}
	return [...]byte{0, EventCME, EventEXE, EventDDE, EventQYE, EventPON, EventURQ, EventRQC, EventOPC, 0}[min(-code/100, 9)]
}
