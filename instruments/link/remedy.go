package link

import (
	"errors"
	"fmt"
	"os"
	"os/user"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
)

// remedy says what a person can do about a device that would not open; empty
// where the kind of fault says it all.
func remedy(a Address, err error) string {
	if a.Scheme != "serial" && a.Scheme != "usbtmc" {
		return ""
	}
	switch {
	case errors.Is(err, ErrDenied):
		return letIn(a.Path)
	case errors.Is(err, ErrMissing):
		return lookFor(a)
	case errors.Is(err, ErrBusy):
		return holder("/proc", a)
	}
	return ""
}

const udevWords = "install the udev rule that 'nightbench ports --udev' prints"

// letIn names the group that may open a device, and the udev rule.
func letIn(path string) string {
	info, err := os.Stat(path)
	if err != nil {
		return udevWords + ", then plug it in again"
	}
	if s, ok := info.Sys().(*syscall.Stat_t); ok && s.Gid != 0 && info.Mode().Perm()&0o060 == 0o060 {
		if g, err := user.LookupGroupId(strconv.Itoa(int(s.Gid))); err == nil {
			return fmt.Sprintf("the group %s may open it: 'sudo usermod -aG %s $USER', then log in again; or %s", g.Name, g.Name, udevWords)
		}
	}
	return "only root may open it: " + udevWords + ", then plug it in again"
}

// lookFor says what is there in place of a device that is missing: after
// plugging in again a device of the same kind may have another number.
func lookFor(a Address) string {
	if a.Path == "" {
		return "is it plugged in and switched on? 'nightbench ports' lists what is there"
	}
	words := "is it plugged in and switched on?"
	name := filepath.Base(a.Path)
	kind := strings.TrimRight(name, "0123456789")
	if kind != name {
		words += " its number changes when it is plugged in again: use the name that stays, which 'nightbench ports' lists"
	}
	if near := besides(a.Path, kind); len(near) > 0 {
		words += "; there are: " + strings.Join(near, ", ")
	}
	return words
}

// besides lists what lies beside a missing device: those of its kind, or in a
// folder of names that stay, all.
func besides(path, kind string) (near []string) {
	entries, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		return nil
	}
	for _, e := range entries {
		if filepath.Base(filepath.Dir(path)) == "by-id" || kind != filepath.Base(path) && strings.HasPrefix(e.Name(), kind) {
			near = append(near, filepath.Join(filepath.Dir(path), e.Name()))
		}
	}
	return near[:min(len(near), 5)]
}

// holder finds the program that has a device open, where this user may see it.
func holder(proc string, a Address) string {
	path := strings.TrimPrefix(a.Canonical(), a.Scheme+"://")
	open, err := filepath.Glob(filepath.Join(proc, "[0-9]*/fd/*"))
	if err != nil {
		return ""
	}
	i := slices.IndexFunc(open, func(fd string) bool {
		to, err := os.Readlink(fd)
		return err == nil && to == path
	})
	if i < 0 {
		return "close the other program that holds it; a terminal program or a second bench, perhaps"
	}
	pid := filepath.Base(filepath.Dir(filepath.Dir(open[i])))
	if pid == strconv.Itoa(os.Getpid()) {
		return "this program itself has it open already: is one port given to two instruments?"
	}
	return fmt.Sprintf("close the program that holds it: %s, process %s", readLine(filepath.Join(proc, pid), "comm"), pid)
}
