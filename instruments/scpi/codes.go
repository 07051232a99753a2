package scpi

// Error codes of SCPI-1999 volume 2 chapter 21 that this package or simulated
// instruments raise.
const (
	CommandError          = -100
	InvalidCharacter      = -101
	SyntaxError           = -102
	InvalidSeparator      = -103
	DataTypeError         = -104
	ParameterNotAllowed   = -108
	MissingParameter      = -109
	HeaderSeparatorError  = -111
	MnemonicTooLong       = -112
	UndefinedHeader       = -113
	HeaderSuffixRange     = -114
	UnexpectedNumber      = -115
	InvalidInNumber       = -121
	ExponentTooLarge      = -123
	TooManyDigits         = -124
	NumericNotAllowed     = -128
	InvalidSuffix         = -131
	SuffixTooLong         = -134
	SuffixNotAllowed      = -138
	InvalidCharacterData  = -141
	CharacterTooLong      = -144
	CharacterNotAllowed   = -148
	InvalidString         = -151
	StringNotAllowed      = -158
	InvalidBlock          = -161
	BlockNotAllowed       = -168
	InvalidExpression     = -171
	ExpressionNotAllowed  = -178
	InitIgnored           = -213
	SettingsConflict      = -221
	DataOutOfRange        = -222
	TooMuchData           = -223
	IllegalParameter      = -224
	DataStale             = -230
	DeviceError           = -300
	QueueOverflow         = -350
	InputOverrun          = -363
	QueryInterrupted      = -410
	QueryUnterminated     = -420
	UnterminatedAfterFree = -440
)

// standardTexts are the error texts as makers' manuals restate them (Agilent
// 8712ET ch. 13, HP 70004A p. 8-14, R&S CMU200, Chroma 19020 p. 99, Keysight
// AC6800 p. 93, GW Instek PSU p. 135); from memory are -148, -160, -161, -170,
// -201 to -203, -210, -212 to -214, -220, -225, -231, -240, -241, -311, -314,
// -361 to -363, -365.
var standardTexts = map[int]string{
	0: "No error", -100: "Command error", -101: "Invalid character", -102: "Syntax error",
	-103: "Invalid separator", -104: "Data type error", -105: "GET not allowed",
	-108: "Parameter not allowed", -109: "Missing parameter", -110: "Command header error",
	-111: "Header separator error", -112: "Program mnemonic too long", -113: "Undefined header",
	-114: "Header suffix out of range", -115: "Unexpected number of parameters",
	-120: "Numeric data error", -121: "Invalid character in number", -123: "Exponent too large",
	-124: "Too many digits", -128: "Numeric data not allowed", -130: "Suffix error",
	-131: "Invalid suffix", -134: "Suffix too long", -138: "Suffix not allowed",
	-140: "Character data error", -141: "Invalid character data", -144: "Character data too long",
	-148: "Character data not allowed", -150: "String data error", -151: "Invalid string data",
	-158: "String data not allowed", -160: "Block data error", -161: "Invalid block data",
	-168: "Block data not allowed", -170: "Expression error", -171: "Invalid expression",
	-178: "Expression data not allowed",
	-200: "Execution error", -201: "Invalid while in local", -202: "Settings lost due to rtl",
	-203: "Command protected", -210: "Trigger error", -211: "Trigger ignored", -212: "Arm ignored",
	-213: "Init ignored", -214: "Trigger deadlock", -220: "Parameter error",
	-221: "Settings conflict", -222: "Data out of range", -223: "Too much data",
	-224: "Illegal parameter value", -225: "Out of memory", -230: "Data corrupt or stale",
	-231: "Data questionable", -240: "Hardware error", -241: "Hardware missing",
	-300: "Device-specific error", -310: "System error", -311: "Memory error",
	-313: "Calibration memory lost", -314: "Save/recall memory lost",
	-315: "Configuration memory lost", -321: "Out of memory", -330: "Self-test failed",
	-350: "Queue overflow", -360: "Communication error", -361: "Parity error in program message",
	-362: "Framing error in program message", -363: "Input buffer overrun", -365: "Time out error",
	-400: "Query error", -410: "Query INTERRUPTED", -420: "Query UNTERMINATED",
	-430: "Query DEADLOCKED", -440: "Query UNTERMINATED after indefinite response",
}

// StandardText is the text of a standard error code, or of its class when the
// code itself is not in the table.
func StandardText(code int) string {
	for _, c := range []int{code, code / 10 * 10, code / 100 * 100} {
		if text, ok := standardTexts[c]; ok && c != 0 || code == 0 {
			return text
		}
	}
	return "Unknown error"
}

// maxText is the longest error text with its device information, in
// characters (SCPI-1999 volume 2 section 21.8, from memory).
const maxText = 255

// NewFault is a fault with the standard's text, followed by device
// information if info is not empty.
func NewFault(code int, info string) Fault {
	text := StandardText(code)
	if info != "" {
		text += ";" + info
	}
	return Fault{Code: code, Text: text[:min(len(text), maxText)]}
}
