package discover

import (
	"fmt"
	"strings"
)

// Rule is the udev rule that lets the group dialout, and whoever sits at the
// computer, open a device, and gives it a name that stays where it has none.
// Empty for what is on no USB.
func Rule(f Found) string {
	if f.Device == nil || f.Device.USB.Vendor == "" {
		return ""
	}
	d := f.Device
	subsystem := map[string]string{"serial": "tty", "usbtmc": "usbmisc"}[d.Scheme]
	match := fmt.Sprintf(`SUBSYSTEM=="%s", ATTRS{idVendor}=="%s", ATTRS{idProduct}=="%s"`, subsystem, d.USB.Vendor, d.USB.Product)
	name := d.USB.Vendor + "-" + d.USB.Product
	if d.USB.Serial != "" {
		match += fmt.Sprintf(`, ATTRS{serial}=="%s"`, d.USB.Serial)
		name += "-" + d.USB.Serial
	}
	safe := strings.Map(func(r rune) rune {
		if r == '-' || r == '_' || r >= '0' && r <= '9' || r >= 'A' && r <= 'Z' || r >= 'a' && r <= 'z' {
			return r
		}
		return '_'
	}, name)
	return fmt.Sprintf("# %s\n%s, GROUP=\"dialout\", MODE=\"0660\", TAG+=\"uaccess\", SYMLINK+=\"nightbench/%s\"\n", f.Words, match, safe)
}
