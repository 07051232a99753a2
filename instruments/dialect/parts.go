package dialect

import "time"

// Link is how the family talks; zero fields mean the link's own defaults.
// Clear is one of
//
//	bytes   ClearBytes are sent, such as 3 (Ctrl-C) or 27, 67 (ESC C)
//	break   a break on the serial line; ClearReply is what comes when it is done
//	usbtmc  that of the link itself, which needs no word here
//	socket  a control socket of its own: stated, and until links can do it treated as
//	reopen  the stream is opened anew when draining does not help
//	none    draining is all there is
type Link struct {
	Kinds      []string      // serial, tcp, usbtmc, hislip: what the family has; none stated: not known
	Port       int           // TCP port
	Line       string        // serial settings as an address gives them, "baud=115200&stop=2"; the address wins
	Terminator string        // what ends a message sent
	ReplyEnd   byte          // what ends a reply; 0 means NL. CR before NL and after it need no setting
	Echo       bool          // each line sent comes back before its reply
	Timeout    time.Duration // of one reply; settling and aperture come on top
	Gap        time.Duration // least time between two exchanges; a line's own rest comes on top
	Longest    int           // most characters a message may have; 0: no bound known
	Clear      string        // how a device clear is done: see below; empty: not known
	ClearBytes []byte
	ClearReply string
	Source     string
}

// ErrorQueue is how errors are asked for.
//
//	queue   ask gives code, text; one error a reply; code 0, or a reply of None, is the end
//	events  Status is read first, then ask gives code, text as in a queue; code Again means that Status has to be read again
//	text    ask gives text without a code; a reply of None means no error
//	none    it has none
type ErrorQueue struct {
	Form   string
	Ask    string
	Status string // form events: *ESR?
	Again  int    // form events
	Depth  int
	None   []string // whole replies that mean no error
	Sign   string   // positive: the standard's codes without their sign, 113 for -113; negative, the default: as in the standard
	Source string
}

// Completion is how the end of an operation is seen. A scope may have a line
// of its own for the end of a record (acquired), which wins there.
//
//	held    ask is answered when all is done, with one of Until ("1" and "+1" where none is stated)
//	polled  ask is answered at once; done when the reply is one of Until
//	dwell   nothing can be asked: Dwell is waited
type Completion struct {
	Style  string
	Ask    string
	Until  []string
	Dwell  time.Duration
	Source string
}

// Channel says how a channel is meant: by a line sent before every other
// (Select), or by {channel} in the lines themselves, as prefix (CH{channel}:VOLT),
// suffix (OUTP{channel}), first parameter (OUTP CH{channel},ON) or list
// (VOLT 5,(@{channel})). Names are put in for numbers, the first for channel 1.
type Channel struct {
	Select *Line
	Count  int // how many it has; 0: not known
	Names  []string
	Source string
}

// Protection says what clearing a protection latch does.
type Protection struct {
	ClearEnergises bool
	Source         string
}

// Meter is what a meter's readings take.
type Meter struct {
	AutoZero  bool          // each reading takes two apertures
	RangeTime time.Duration // allowed for a change of range or function
	SpeedFrom string        // nplc or aperture
	Source    string
}

// Speed is one of a meter's speeds. Setting is what the instrument is told:
// periods of the power line, or seconds with SpeedFrom "aperture". Resolution
// and Adds (what haste adds to the limit of error) are shares of the range.
type Speed struct {
	Setting    float64
	Resolution float64
	Adds       float64
	Source     string
}

// Screen is how a scope's settings in divisions make a screen. Offset says
// what the line vertical_offset sets:
//
//	centre     the voltage in the middle of the screen
//	shift      what is added to the signal: the middle is at minus it
//	divisions  where 0 V stands, in divisions above the middle
type Screen struct {
	Divisions     float64 // high
	TimeDivisions float64 // wide
	Offset        string
	Source        string
}

// Conditions are what the limits of error hold for, as the maker states them.
type Conditions struct {
	Interval    string // since calibration: 24 h, 90 d, 1 y or 2 y
	Temperature string // "23 ± 5 °C"
	WarmUp      time.Duration
	Speed       string // of readings: "10 PLC"
	AutoZero    bool
	Source      string
}
