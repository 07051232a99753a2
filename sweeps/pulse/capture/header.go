package capture

import "strings"

// header is what the lines above the samples set, by plain lower-case key: "sampleinterval".
type header map[string]setting

type setting struct {
	said string // the key as written, for words
	text string // the value as written
	x    float64
	unit unit
	list []string // all fields after the key
}

// read takes key and value from a line: "Sample Interval,4e-7,s", "#Rate: 1 MSa/s", "dt=1us".
func (h header) read(row []string) {
	for i, f := range row {
		key, value, found := strings.Cut(f, ":")
		if !found {
			key, value, found = strings.Cut(f, "=")
		}
		if found && strings.TrimSpace(value) != "" {
			h.put(key, value, "", append([]string{value}, row[i+1:]...))
			if _, taken := h[plain(key)]; taken {
				continue
			}
		}
		if i+1 == len(row) {
			break
		}
		next := ""
		if i+2 < len(row) {
			next = row[i+2]
		}
		h.put(f, row[i+1], next, row[i+1:])
	}
}

// readBelow takes keys from one line and their values from the same fields of the next.
func (h header) readBelow(row, below []string) {
	for i := range min(len(row), len(below)) {
		if _, ok := unitOf(row[i]); !ok {
			h.put(row[i], below[i], "", below[i:])
		}
	}
}

// put keeps the first number, or text, given for a key; the unit may stand behind it or in the key.
func (h header) put(key, value, next string, list []string) {
	text := key
	key = plain(key)
	if key == "" {
		return
	}
	if old, taken := h[key]; taken && (old.unit.factor != 0 || key == "") {
		return
	}
	value = strings.TrimSpace(value)
	if i := strings.LastIndexByte(value, ':'); i > 0 && (value[0] < '0' || value[0] > '9') {
		value = strings.TrimSpace(value[i+1:]) // "Analog:1.0E-06"
	}
	x, rest := leading(strings.ReplaceAll(value, ",", "."))
	_, known := unitOf(rest)
	if value == "" || rest == value || rest != "" && !known {
		if _, taken := h[key]; !taken && value != "" {
			h[key] = setting{said: text, text: value, list: list}
		}
		return
	}
	s := setting{said: strings.Trim(text, "# "), text: value, x: x, unit: unit{"", 1}, list: list}
	if rest == "" {
		rest = next
	}
	if u, ok := unitOf(rest); ok {
		s.unit = u
	} else if i := strings.IndexAny(text, "(["); i >= 0 {
		if u, ok := unitOf(text[i:]); ok {
			s.unit = u
			h[plain(text[:i])] = s
		}
	}
	h[key] = s
}

// The keys under which scopes of several makers give these; plain spelling.
var (
	intervalKeys = []string{"sampleinterval", "samplinginterval", "increment", "xincrement", "xincr", "xinc", "timeincrement", "deltax", "deltat", "xdelta", "dt", "tdelta", "tinc",
		"samplingperiod", "sampleperiod", "hresolution", "timeresolution", "timestep", "timeinterval", "interval", "horizontalinterval", "horizinterval", "timepersample", "timeperpoint", "resolution"}
	rateKeys  = []string{"samplerate", "samplingrate", "samplefrequency", "samplingfrequency", "samplespersecond", "srate", "fs", "rate"}
	startKeys = []string{"start", "starttime", "xstart", "xzero", "xorigin", "xorg", "t0", "timestart", "firstsample"}
)

// interval is the sample interval in s, and under which key it stood.
func (h header) interval() (dt float64, key string, ok bool) {
	for _, k := range intervalKeys {
		if s, there := h[k]; there && s.x > 0 && s.unit.factor > 0 && (s.unit.si == "" || s.unit.si == "s") {
			return s.x * s.unit.factor, k, true
		}
	}
	for _, k := range rateKeys {
		if s, there := h[k]; there && s.x > 0 && s.unit.factor > 0 && (s.unit.si == "" || s.unit.si == "Hz") {
			return 1 / (s.x * s.unit.factor), k, true
		}
	}
	return 0, "", false
}

// start is the time of the first sample, s; 0 when not given.
func (h header) start() float64 {
	for _, k := range startKeys {
		if s, there := h[k]; there && s.unit.factor > 0 && (s.unit.si == "" || s.unit.si == "s") {
			return s.x * s.unit.factor
		}
	}
	return 0
}

// list returns the words of a setting, "CH1:V CH2:mV" or fields of their own, what names the channel left off.
func (h header) words(keys ...string) (words []string) {
	for _, k := range keys {
		s, there := h[k]
		if !there {
			continue
		}
		for _, f := range s.list {
			for w := range strings.FieldsSeq(f) {
				if i := strings.LastIndexByte(w, ':'); i >= 0 {
					w = w[i+1:]
				}
				words = append(words, w)
			}
		}
		return words
	}
	return nil
}
