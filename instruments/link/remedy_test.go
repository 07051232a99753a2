package link

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// tree makes files, folders for names that end in a slash, and links for
// "name -> target".
func tree(t *testing.T, entries ...string) string {
	t.Helper()
	root := t.TempDir()
	for _, e := range entries {
		name, content, _ := strings.Cut(e, " = ")
		name, target, isLink := strings.Cut(name, " -> ")
		path := filepath.Join(root, name)
		err := os.MkdirAll(filepath.Dir(path), 0o755)
		switch {
		case err != nil:
		case isLink:
			err = os.Symlink(target, path)
		case strings.HasSuffix(name, "/"):
			err = os.MkdirAll(path, 0o755)
		default:
			err = os.WriteFile(path, []byte(content+"\n"), 0o644)
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	return root
}

func opened(t *testing.T, text string) error {
	t.Helper()
	a, err := Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	l, err := Open(t.Context(), a, Options{})
	if err == nil {
		l.Close()
	}
	return err
}

func TestMissingNamesWhatIsThere(t *testing.T) {
	dir := tree(t, "ttyUSB1", "ttyUSB10", "ttyS0", "by-id/usb-PUMPWORKS_PS-1-if00", "ttyACM0")
	for path, want := range map[string]string{
		"ttyUSB0":            "its number changes when it is plugged in again: use the name that stays, which 'nightbench ports' lists; there are: " + dir + "/ttyUSB1, " + dir + "/ttyUSB10)",
		"by-id/usb-GONE":     "switched on?; there are: " + dir + "/by-id/usb-PUMPWORKS_PS-1-if00)",
		"by-path/gone-if-00": "is it plugged in and switched on? its number",
	} {
		err := opened(t, "serial://"+filepath.Join(dir, path))
		if !errors.Is(err, ErrMissing) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v; want it to say %q", path, err, want)
		}
	}
}

func TestBusyNamesTheHolder(t *testing.T) {
	a, _ := onPty(t, "")
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if _, err := Open(t.Context(), a, Options{}); !errors.Is(err, ErrBusy) || !strings.Contains(err.Error(), "this program itself has it open already") {
		t.Errorf("by this one: %v", err)
	}
	proc := tree(t, "4711/comm = terminal", "4711/fd/0 -> /dev/null", "4711/fd/5 -> "+a.Path, "812/fd/3 -> /dev/ttyX")
	if got := holder(proc, a); got != "close the program that holds it: terminal, process 4711" {
		t.Errorf("by another: %q", got)
	}
	if got := holder(tree(t, "812/fd/3 -> /dev/ttyX"), a); !strings.Contains(got, "close the other program") {
		t.Errorf("unseen: %q", got)
	}
}

// Root may open everything, so what the system says is put together here.
func TestDeniedNamesTheRemedy(t *testing.T) {
	path := filepath.Join(tree(t, "ttyUSB0"), "ttyUSB0")
	a := Address{Scheme: "serial", Path: path, text: "serial://" + path}
	l := &Link{addr: a}
	err := l.fault("open", openKind(&os.PathError{Op: "open", Path: path, Err: os.ErrPermission}))
	if !errors.Is(err, ErrDenied) || !strings.Contains(err.Error(), "only root may open it: install the udev rule that 'nightbench ports --udev' prints") {
		t.Errorf("got %v", err)
	}
	if err := os.Chmod(path, 0o660); err != nil {
		t.Fatal(err)
	}
	if os.Getuid() == 0 { // a file of the group daemon, which every system has as 1 (Linux Standard Base, 23.2)
		if err := os.Chown(path, -1, 1); err != nil {
			t.Fatal(err)
		}
	}
	if got := letIn(path); !strings.Contains(got, "sudo usermod -aG ") || !strings.Contains(got, "udev rule") {
		t.Errorf("got %q", got)
	}
}
