package report

import (
	"bytes"
	"context"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// open loads a page in a headless Chromium and gives what it says on its console and what it asked the network for.
func open(t *testing.T, page string) (console, requests string) {
	t.Helper()
	dir := t.TempDir()
	file, net := filepath.Join(dir, "page.html"), filepath.Join(dir, "net.json")
	if err := os.WriteFile(file, []byte(page), 0o600); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	cmd := exec.CommandContext(ctx, "chromium", "--headless", "--no-sandbox", "--disable-gpu", "--disable-background-networking", "--disable-component-update",
		"--disable-sync", "--disable-extensions", "--no-first-run", "--host-resolver-rules=MAP * ~NOTFOUND", "--user-data-dir="+filepath.Join(dir, "profile"),
		"--enable-logging=stderr", "--log-net-log="+net, "--dump-dom", "file://"+file)
	var said bytes.Buffer
	cmd.Stderr = &said
	dom, err := cmd.Output()
	if err != nil {
		t.Skipf("chromium did not run: %v", err)
	}
	if !bytes.Contains(dom, []byte("</html>")) {
		t.Fatalf("the page did not load: %q", dom)
	}
	for line := range strings.Lines(said.String()) {
		if strings.Contains(line, "CONSOLE") {
			console += line
		}
	}
	log, _ := os.ReadFile(net)
	for line := range strings.Lines(string(log)) {
		if strings.Contains(line, "tracker.invalid") {
			requests += line
		}
	}
	return console, requests
}

// TestOpensQuietly: no console message and no request, while a page that has both is seen.
func TestOpensQuietly(t *testing.T) {
	if testing.Short() {
		t.Skip("starts a browser")
	}
	if _, err := exec.LookPath("chromium"); err != nil {
		t.Skip("no chromium here")
	}
	r := sampleRun(Classes, 3000, 0, append(nasty, `<img src="https://tracker.invalid/x">`))
	page := strings.ReplaceAll(draw(t, r), "\x00", "")
	if console, requests := open(t, page); console != "" || requests != "" {
		t.Errorf("console:\n%s\nrequests:\n%s", console, requests)
	}
	bad := strings.Replace(page, "<main>", `<main><img src="https://tracker.invalid/x"><script>document.title = "ran"</script>`, 1)
	if console, _ := open(t, bad); !strings.Contains(console, "Content Security Policy") {
		t.Errorf("the policy did not refuse an image and a script; console:\n%s", console)
	}
	free := strings.Replace(bad, "default-src 'none'; style-src 'unsafe-inline'", "img-src *; style-src 'unsafe-inline'", 1)
	if _, requests := open(t, free); requests == "" {
		t.Error("a request was made and not seen")
	}
}
