package main

import (
	"os/exec"
	"regexp"
	"runtime/debug"
	"slices"
	"strings"
	"testing"
)

func TestVersionSaysWhatItWasBuiltFrom(t *testing.T) {
	main := debug.Module{Path: "ebbline", Version: "v0.1.0"}
	setting := func(k, v string) debug.BuildSetting { return debug.BuildSetting{Key: k, Value: v} }
	for _, c := range []struct {
		info *debug.BuildInfo
		want string
	}{
		{nil, "module    ebbline\nrevision  not recorded\n"},
		{&debug.BuildInfo{Main: debug.Module{Path: "ebbline", Version: "(devel)"}}, "module    ebbline\nrevision  not recorded\n"},
		{&debug.BuildInfo{Main: main, Settings: []debug.BuildSetting{setting("vcs.revision", "12ab"), setting("vcs.time", "2026-12-01T10:00:00Z"), setting("vcs.modified", "false")}},
			"module    ebbline v0.1.0\nrevision  12ab of 2026-12-01T10:00:00Z\n"},
		{&debug.BuildInfo{Main: main, Settings: []debug.BuildSetting{setting("vcs.revision", "12ab"), setting("vcs.modified", "true")}},
			"module    ebbline v0.1.0\nrevision  12ab, with changes\n"},
	} {
		if got := builtFrom(c.info); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
	said := quietly(t, []string{"version"})
	if flag := quietly(t, []string{"--version"}); !strings.HasPrefix(said, flag) || strings.Count(flag, "\n") != 1 {
		t.Errorf("--version says %q, and version %q", flag, said)
	}
}

// noticeHead is the head of a licence in notices.txt.
var noticeHead = regexp.MustCompile(`(?m)^(\S+ v\S+) \(\S+\)$`)

// notNamed compares the modules that are built in with those that notices name.
func notNamed(text string, modules []string) (missing, needless []string) {
	named := map[string]bool{}
	for _, m := range noticeHead.FindAllStringSubmatch(text, -1) {
		named[m[1]] = true
	}
	for _, m := range modules {
		if !named[m] {
			missing = append(missing, m)
		}
	}
	for m := range named {
		if !slices.Contains(modules, m) {
			needless = append(needless, m)
		}
	}
	return missing, needless
}

// TestNoticesNameEveryModule asks the go command what is built into the program
// on each system and wants every module there with its version, and no other.
func TestNoticesNameEveryModule(t *testing.T) {
	program, err := exec.LookPath("go")
	if err != nil {
		t.Skip("skipped: go is not installed")
	}
	var modules []string
	for _, target := range []string{"linux", "windows", "darwin"} {
		cmd := exec.Command(program, "list", "-deps", "-f", "{{with .Module}}{{if not .Main}}{{.Path}} {{.Version}}{{end}}{{end}}", ".")
		cmd.Env = append(cmd.Environ(), "GOOS="+target, "GOARCH=amd64", "CGO_ENABLED=0")
		out, err := cmd.Output()
		if err != nil {
			t.Fatalf("%s: %v", target, err)
		}
		for _, m := range strings.Split(string(out), "\n") {
			if m != "" && !slices.Contains(modules, m) {
				modules = append(modules, m)
			}
		}
	}
	if len(modules) < 10 {
		t.Fatalf("only %d modules listed: %v", len(modules), modules)
	}
	missing, needless := notNamed(notices, modules)
	if len(missing)+len(needless) > 0 {
		t.Errorf("notices.txt lacks %q and names %q, which is not built in; .ci/notices makes it anew", missing, needless)
	}
	for _, part := range []string{"\nebbline (LICENSE)\n", "\nGo, its runtime and standard library (LICENSE)\n", "Permission is hereby granted", "SIL OPEN FONT LICENSE"} {
		if !strings.Contains(notices, part) {
			t.Errorf("notices.txt lacks %q", part)
		}
	}
	// Another version of a module, or one more, is seen.
	missing, needless = notNamed(strings.ReplaceAll(notices, modules[0]+" (", modules[0]+"9 ("), append(modules, "example.org/more v1.0.0"))
	if len(missing) != 2 || len(needless) != 1 {
		t.Errorf("planted faults: lacks %q, names %q", missing, needless)
	}
	if got := quietly(t, []string{"version", "--licences"}); got != notices {
		t.Errorf("version --licences prints %d bytes of %d", len(got), len(notices))
	}
}
