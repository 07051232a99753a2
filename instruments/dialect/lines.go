package dialect

import "nightbench/instruments/si"

// spec says what a line of a role must be.
type spec struct {
	does        string // for messages: "this dialect can't switch the output off"
	needs       shape
	unit        si.Unit
	required    bool
	channel     bool   // {channel} may stand in it
	share       bool   // its reply is a share: percent or ratio has to be said
	alternative string // what may do the same in another way
}

// shape is which halves a line must have.
type shape int

const (
	sends   shape = iota // send only
	asks                 // ask only
	setting              // both, with {value}
	anyHalf              // send, or both
)

var common = map[string]spec{
	"identify":     {does: "say who it is", needs: asks, required: true},
	"clear_status": {does: "clear its status", needs: sends},
	"reset":        {does: "reset itself", needs: sends},
}

var lines = map[Role]map[string]spec{
	RoleSupply: {
		"off":                  {does: "switch its output off", needs: sends, required: true, channel: true},
		"enable":               {does: "enable a channel behind a master switch", needs: anyHalf, channel: true, alternative: "on"},
		"on":                   {does: "switch its output on", needs: sends, required: true, channel: true},
		"output":               {does: "say whether its output is on", needs: asks, required: true, channel: true},
		"voltage":              {does: "set a voltage", needs: setting, unit: si.Volt, required: true, channel: true},
		"current_limit":        {does: "set a current limit", needs: setting, unit: si.Ampere, required: true, channel: true},
		"over_voltage":         {does: "set an over-voltage level", needs: setting, unit: si.Volt, channel: true},
		"over_voltage_arm":     {does: "arm its over-voltage protection", needs: anyHalf, channel: true, alternative: "over_voltage"},
		"over_voltage_tripped": {does: "say whether over-voltage tripped it", needs: asks, channel: true},
		"over_voltage_clear":   {does: "clear an over-voltage trip", needs: sends, channel: true},
		"over_current":         {does: "set an over-current level", needs: setting, unit: si.Ampere, channel: true},
		"over_current_arm":     {does: "arm its over-current protection", needs: anyHalf, channel: true, alternative: "over_current"},
		"over_current_tripped": {does: "say whether over-current tripped it", needs: asks, channel: true},
		"over_current_clear":   {does: "clear an over-current trip", needs: sends, channel: true},
		"measure_voltage":      {does: "measure its voltage", needs: asks, unit: si.Volt, required: true, channel: true},
		"measure_current":      {does: "measure its current", needs: asks, unit: si.Ampere, required: true, channel: true},
		"limiting":             {does: "say whether it limits the current", needs: asks, channel: true},
	},
	RoleMeter: {
		"voltage_function": {does: "measure DC volts", needs: anyHalf},
		"voltage_range":    {does: "set a voltage range", needs: setting, unit: si.Volt},
		"voltage_speed":    {does: "set the speed of voltage readings", needs: setting},
		"voltage_read":     {does: "take a new reading of a voltage", needs: asks, alternative: "read"},
		"current_function": {does: "measure DC current", needs: anyHalf},
		"current_range":    {does: "set a current range", needs: setting, unit: si.Ampere},
		"current_speed":    {does: "set the speed of current readings", needs: setting},
		"current_read":     {does: "take a new reading of a current", needs: asks, alternative: "read"},
		"read":             {does: "take a new reading", needs: asks, alternative: "voltage_read"},
	},
	RoleScope: {
		"format":              {does: "set the format of its records", needs: anyHalf, alternative: "setup"},
		"byte_order":          {does: "set the byte order of its records", needs: anyHalf, alternative: "format"},
		"show":                {does: "switch a channel on", needs: anyHalf, channel: true},
		"coupling":            {does: "couple a channel DC", needs: anyHalf, channel: true},
		"probe":               {does: "be told a probe's factor", needs: setting, unit: si.One, channel: true},
		"range_high":          {does: "set the top of the screen", needs: setting, unit: si.Volt, channel: true, alternative: "vertical_scale"},
		"range_low":           {does: "set the bottom of the screen", needs: setting, unit: si.Volt, channel: true, alternative: "vertical_offset"},
		"vertical_scale":      {does: "set volts a division", needs: setting, unit: si.Volt, channel: true, alternative: "range_high"},
		"vertical_offset":     {does: "set a vertical offset", needs: setting, unit: si.Volt, channel: true, alternative: "range_low"},
		"points":              {does: "set the count of samples", needs: setting, unit: si.One, alternative: "waveform.points"},
		"duration":            {does: "set the duration of a record", needs: setting, unit: si.Second, alternative: "time_scale"},
		"time_scale":          {does: "set seconds a division", needs: setting, unit: si.Second, alternative: "duration"},
		"trigger_source":      {does: "trigger on a channel", needs: anyHalf, required: true, channel: true},
		"trigger_level":       {does: "set a trigger level", needs: setting, unit: si.Volt, required: true, channel: true},
		"trigger_slope":       {does: "set the trigger's direction", needs: anyHalf, channel: true},
		"trigger_wait":        {does: "wait for its trigger", needs: anyHalf, alternative: "trigger_source"},
		"trigger_none":        {does: "record without a trigger", needs: anyHalf, alternative: "force"},
		"force":               {does: "force a trigger", needs: sends, alternative: "trigger_none"},
		"single":              {does: "be told to take one record", needs: anyHalf, alternative: "start"},
		"start":               {does: "start a record", needs: sends, required: true},
		"acquired":            {does: "say whether a record is complete", needs: asks, alternative: "completion"},
		"stop":                {does: "stop", needs: sends, alternative: "abort"},
		"abort":               {does: "give up a record", needs: sends, required: true},
		"record_source":       {does: "choose the channel of a record", needs: anyHalf, channel: true, alternative: "record"},
		"part_first":          {does: "hand over a record in parts", needs: setting, unit: si.One, channel: true, alternative: "record"},
		"part_last":           {does: "hand over a record in parts", needs: setting, unit: si.One, channel: true, alternative: "record"},
		"scaling":             {does: "say how its codes are scaled", needs: asks, channel: true, alternative: "record"},
		"record":              {does: "hand over a record", needs: asks, required: true, channel: true},
		"measure_duty":        {does: "measure a duty cycle", needs: asks, unit: si.One, channel: true, share: true},
		"measure_frequency":   {does: "measure a frequency", needs: asks, unit: si.Hertz, channel: true},
		"measure_period":      {does: "measure a period", needs: asks, unit: si.Second, channel: true},
		"measure_pulse_width": {does: "measure a pulse width", needs: asks, unit: si.Second, channel: true},
		"measure_mean":        {does: "measure a mean voltage", needs: asks, unit: si.Volt, channel: true},
	},
	RolePot: {
		"code":           {does: "set a code and read it back", needs: setting, unit: si.One, required: true},
		"highest_code":   {does: "say its highest code", needs: asks},
		"power_on_count": {does: "count its power-ons", needs: asks},
	},
	RoleCutoff: {
		"feed":   {does: "be kept closed", needs: sends, required: true},
		"open":   {does: "be opened", needs: sends, required: true},
		"closed": {does: "say whether its contact is closed", needs: asks, required: true},
		"time":   {does: "be told how long it stays closed", needs: setting, unit: si.Second},
	},
	RoleProbe: {
		"temperature": {does: "measure a temperature", needs: asks, unit: si.Celsius, required: true},
	},
}

// specOf finds what a line of a role must be.
func specOf(role Role, name string) (spec, bool) {
	if s, ok := common[name]; ok {
		return s, true
	}
	s, ok := lines[role][name]
	return s, ok
}

// figures are the quantities a role's [[accuracy]] may be of, with their units.
var figures = map[Role]map[string]si.Unit{
	RoleSupply: {"measure_voltage": si.Volt, "measure_current": si.Ampere},
	RoleMeter:  {"voltage": si.Volt, "current": si.Ampere},
	RoleScope:  {"voltage": si.Volt},
	RolePot:    {},
	RoleCutoff: {},
	RoleProbe:  {},
}
