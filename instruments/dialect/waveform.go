package dialect

// Waveform is the shape of a record.
type Waveform struct {
	Family           string   // of the scaling: see families
	Samples          string   // int8, uint8, int16, uint16; real32; text: numbers separated by commas
	ByteOrder        string   // big or little
	Head             string   // block: # digit count bytes, with as many digits as it likes; none: a plain line (text only)
	Lead             []string // texts of which one may stand before the #, with {channel}
	Tail             string   // what has to come after the bytes: nl, nl nl; any: terminators or nothing
	ClipLow          int      // as the instrument counts; codes at or beyond are flags, not volts
	ClipHigh         int      //
	Levels           int      // family volts: how many the converter has over the screen
	CodesPerDivision float64  // family per-division
	Grid             float64  // family per-division: time divisions from the first point to the last
	Points           int      // where the count can't be set: how many a record has
	MostPoints       int      // a record
	MostARead        int      // a part, with the lines part_first and part_last; 0: all at once
	NeedsStop        bool     // it has to be stopped (line stop) before a record is read
	Negative         string   // of int8: "complement" (the default), or "255" where the manual subtracts 255 from codes over 127
	TimeBase         float64  // relative limit of error of the sample interval, a year after calibration
	Source           string
}

// Size is the bytes a sample takes; 0 for text.
func (w *Waveform) Size() int {
	return map[string]int{"int8": 1, "uint8": 1, "int16": 2, "uint16": 2, "real32": 4}[w.Samples]
}

// family is a scaling: the fields it needs from the instrument, and those that
// stand for 0 where the instrument has none.
type family struct {
	needs, may []string
	formula    string
}

// families are the scalings known. points, where it is among the fields, is
// compared with what comes.
var families = map[string]family{
	"volts-origin": {
		needs:   []string{"xincrement", "xorigin", "yincrement", "yorigin", "yreference"},
		may:     []string{"xreference"},
		formula: "volts = (code − yreference)·yincrement + yorigin; instant = (i − xreference)·xincrement + xorigin",
	},
	"counts-origin": {
		needs:   []string{"xincrement", "xorigin", "yincrement", "yorigin", "yreference"},
		may:     []string{"xreference"},
		formula: "volts = (code − yorigin − yreference)·yincrement; instant = (i − xreference)·xincrement + xorigin",
	},
	"multiplier": {
		needs:   []string{"xincr", "xzero", "ymult", "yoff", "yzero"},
		may:     []string{"pt_off"},
		formula: "volts = (code − yoff)·ymult + yzero; instant = xzero + xincr·(i − pt_off)",
	},
	"per-division": {
		needs:   []string{"volts_per_division", "offset", "seconds_per_division"},
		may:     []string{"delay", "sample_rate", "sample_interval"},
		formula: "volts = code·volts_per_division/codes_per_division − offset; instant of the first = delay − seconds_per_division·grid/2, then 1/sample_rate",
	},
	"code-linear": {
		needs:   []string{"xincrement", "xorigin", "yincrement", "yorigin"},
		formula: "volts = code·yincrement + yorigin; instant = i·xincrement + xorigin",
	},
	"volts": {
		needs:   []string{"xincrement", "xorigin"},
		formula: "the samples are volts; instant = i·xincrement + xorigin",
	},
}
