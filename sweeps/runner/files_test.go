package runner_test

// benchFile is the pump bench; the addresses are put in where it is opened.
const benchFile = `
[bench]
name = "Pump bench"
[supply]
address = "tcp://127.0.0.1:1"
max_voltage = "13 V"
max_current = "1 A"
over_voltage = "14 V"
fuse = "1 A"
between = ["supply", "common"]
[[meter]]
name = "average"
address = "tcp://127.0.0.1:2"
reads = "average_voltage"
between = ["load_hi", "load_lo"]
input_resistance = "10M"
accuracy = { reading = "0.05 %", range = "0.01 %" }
[[meter]]
name = "motor"
address = "tcp://127.0.0.1:3"
reads = "motor_current"
between = ["flyback_top", "load_hi"]
burden = "0.3"
[scope]
address = "tcp://127.0.0.1:4"
earthed = true
[scope.channel.1]
between = ["timer_out", "common"]
probe = 10
[scope.channel.2]
between = ["load_lo", "common"]
probe = 10
[pot]
address = "tcp://127.0.0.1:5"
codes = 257
end_to_end = "100k 20%"
wiper = "75"
max_terminal_voltage = "16 V"
max_current = "2.5 mA"
park = 256
`

// samplePlan is two voltages and eight settings, there and back.
const samplePlan = `
[plan]
name = "Dosing pump driver, sample"
board = "pump-driver-b.toml"
at_most = "2 h"
[[axis]]
set = "supply_voltage"
values = ["9 V", "12 V"]
[[axis]]
set = "pot_resistance"
from = "1k"
to = "47k"
points = 8
spacing = "log"
direction = "both"
[settle]
watch = "average_voltage"
steady = "1 %"
at_most = "20 s"
[measure]
quantities = ["duty", "frequency", "average_voltage", "output_drop", "motor_current", "supply_current"]
repeats = 3
keep_waveform = "every 6"
` + trips

// short is a plan of two voltages and three settings, there and back; more is put at its end.
func short(more string) string {
	return `
[plan]
name = "short"
board = "pump-driver-b.toml"
at_most = "2 h"
[[axis]]
set = "supply_voltage"
values = ["9 V", "12 V"]
[[axis]]
set = "pot_resistance"
values = ["4.7k", "10k", "22k"]
direction = "both"
[settle]
watch = "average_voltage"
steady = "1 %"
at_most = "20 s"
[measure]
quantities = ["duty", "frequency", "average_voltage", "motor_current", "supply_current"]
repeats = 2
keep_waveform = "every 6"
` + more
}

const trips = `
[trip]
motor_current = { limit = "0.8 A", for = "200 ms" }
supply_current = { limit = "0.9 A", for = "200 ms" }
supply_voltage = { limit = "13 V", for = "200 ms" }
`
