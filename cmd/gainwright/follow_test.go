package main

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/url"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/report"
)

// following serves a design's report for the length of a test.
func following(t *testing.T, text string) (address, file string) {
	t.Helper()
	file = filepath.Join(t.TempDir(), "design.gain")
	write(t, file, text)
	ctx, cancel := context.WithCancel(t.Context())
	ready, ended := make(chan string, 1), make(chan error, 1)
	a := &app{in: strings.NewReader(""), out: io.Discard, errOut: io.Discard, digits: 5}
	go func() { ended <- a.follow(ctx, file, func(address string) { ready <- address }) }()
	t.Cleanup(func() {
		cancel()
		select {
		case err := <-ended:
			if err != nil {
				t.Error(err)
			}
		case <-time.After(10 * time.Second):
			t.Error("the server does not end")
		}
	})
	select {
	case address = <-ready:
	case err := <-ended:
		t.Fatal(err)
	}
	return address, file
}

func write(t *testing.T, file, text string) {
	t.Helper()
	if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
}

// ask sends a request and gives status, headers and body.
func ask(t *testing.T, method, address string, change func(r *http.Request)) (int, http.Header, string) {
	t.Helper()
	r, err := http.NewRequestWithContext(t.Context(), method, address, nil)
	if err != nil {
		t.Fatal(err)
	}
	if change != nil {
		change(r)
	}
	answer, err := http.DefaultTransport.RoundTrip(r)
	if err != nil {
		t.Fatal(err)
	}
	defer answer.Body.Close()
	body, err := io.ReadAll(answer.Body)
	if err != nil {
		t.Fatal(err)
	}
	return answer.StatusCode, answer.Header, string(body)
}

func TestForgedRequestsAreRefused(t *testing.T) {
	address, file := following(t, "\"secret\"\n")
	u, err := url.Parse(address)
	if err != nil {
		t.Fatal(err)
	}
	if host, _, err := net.SplitHostPort(u.Host); err != nil || host != "127.0.0.1" {
		t.Errorf("the page is served at %s", u.Host)
	}
	base := "http://" + u.Host
	token := u.Query().Get("token")
	if len(token) < 32 {
		t.Errorf("the token %q is short", token)
	}
	header := func(name, value string) func(*http.Request) {
		return func(r *http.Request) { r.Header.Set(name, value) }
	}
	for name, c := range map[string]struct {
		method, address string
		change          func(*http.Request)
		status          int
	}{
		"the page":            {"GET", address, nil, 200},
		"from the page":       {"GET", address, header("Origin", base), 200},
		"no token":            {"GET", base + "/", nil, 403},
		"wrong token":         {"GET", base + "/?token=" + strings.Repeat("0", len(token)), nil, 403},
		"part of the token":   {"GET", base + "/?token=" + token[:31], nil, 403},
		"next without token":  {"GET", base + "/next?after=0", nil, 403},
		"another host":        {"GET", address, func(r *http.Request) { r.Host = "evil.example" }, 403},
		"localhost":           {"GET", address, func(r *http.Request) { r.Host = "localhost:" + u.Port() }, 403},
		"host without port":   {"GET", address, func(r *http.Request) { r.Host = "127.0.0.1" }, 403},
		"another origin":      {"GET", address, header("Origin", "http://evil.example"), 403},
		"no origin at all":    {"GET", address, header("Origin", "null"), 403},
		"another site":        {"GET", address, header("Sec-Fetch-Site", "cross-site"), 403},
		"post":                {"POST", address, nil, 405},
		"the file":            {"GET", base + "/design.gain?token=" + token, nil, 404},
		"out of the folder":   {"GET", base + "/../../etc/passwd?token=" + token, nil, 404},
		"a version in words":  {"GET", base + "/next?after=x&token=" + token, nil, 400},
		"the whole file name": {"GET", base + file + "?token=" + token, nil, 404},
	} {
		status, _, body := ask(t, c.method, c.address, c.change)
		if status != c.status || (status != 200) == strings.Contains(body, "secret") {
			t.Errorf("%s: status %d, want %d; %q", name, status, c.status, body[:min(len(body), 80)])
		}
	}
}

func TestTheLivePagesPolicy(t *testing.T) {
	address, _ := following(t, "1\n")
	_, header, body := ask(t, "GET", address, nil)
	_, again, _ := ask(t, "GET", address, nil)
	policy := header.Get("Content-Security-Policy")
	for _, want := range []string{"default-src 'none'", "script-src 'nonce-", "frame-ancestors 'none'", "connect-src 'self'"} {
		if !strings.Contains(policy, want) {
			t.Errorf("the policy %q lacks %s", policy, want)
		}
	}
	if strings.Contains(policy, "unsafe") || policy == again.Get("Content-Security-Policy") {
		t.Error("the policy is loose, or its word comes twice")
	}
	_, after, _ := strings.Cut(policy, "script-src 'nonce-")
	nonce, _, _ := strings.Cut(after, "'")
	if !strings.Contains(body, `<script nonce="`+nonce+`">`) || header.Get("Access-Control-Allow-Origin") != "" {
		t.Error("the page's script does not carry the policy's word, or another site may read the page")
	}
}

func TestMalformedRequestsAreRefused(t *testing.T) {
	address, _ := following(t, "1\n")
	u, _ := url.Parse(address)
	good := "GET " + u.RequestURI() + " HTTP/1.1\r\nHost: " + u.Host + "\r\n"
	for _, text := range []string{
		"\r\n\r\n", "GET\r\n\r\n", "GET / HTTP/2.0\r\nHost: " + u.Host + "\r\n\r\n",
		"GET http://" + u.Host + u.RequestURI() + " HTTP/1.1\r\nHost: " + u.Host + "\r\n\r\n",
		good + "Host: evil.example\r\n\r\n",
		good + "Origin: http://" + u.Host + "\r\nOrigin: http://evil.example\r\n\r\n",
		good + "Content-Length: 4\r\n\r\nabcd", good + "Transfer-Encoding: chunked\r\n\r\n0\r\n\r\n",
		good + "X: " + strings.Repeat("x", 20<<10) + "\r\n\r\n",
		"GET /%zz HTTP/1.1\r\nHost: " + u.Host + "\r\n\r\n",
	} {
		conn, err := net.Dial("tcp", u.Host)
		if err != nil {
			t.Fatal(err)
		}
		fmt.Fprint(conn, text)
		_ = conn.SetReadDeadline(time.Now().Add(8 * time.Second))
		line, err := bufio.NewReader(conn).ReadString('\n')
		if err == nil && !strings.HasPrefix(line, "HTTP/1.1 4") {
			t.Errorf("%.60q is answered with %q", text, line)
		}
		conn.Close()
	}
}

// later waits for the version after the one given.
func later(t *testing.T, address, version string) (next, body string) {
	t.Helper()
	status, header, body := ask(t, "GET", strings.Replace(address, "/?", "/next?after="+version+"&", 1), nil)
	if status != 200 {
		t.Fatalf("status %d", status)
	}
	return header.Get("X-Report-Version"), body
}

func TestASaveRenewsThePageAndAnErrorKeepsTheRest(t *testing.T) {
	address, file := following(t, "a = 2\na\n11*a\nrequire a < 3\n")
	version, body := later(t, address, "0")
	if !strings.Contains(body, "22") {
		t.Fatal("the page lacks a result")
	}
	begin := time.Now()
	write(t, file, "a = 3\na\n11*a\nrequire a < 3\n")
	version, body = later(t, address, version)
	if took := time.Since(begin); took > 2*time.Second {
		t.Errorf("the page came %v after the save", took)
	}
	if !strings.Contains(body, "33") || !strings.Contains(body, "missed") {
		t.Error("the page is not renewed")
	}
	for _, broken := range []string{"a = 3\nb\n11*a\nrequire a < 3\n", "a = 3\n1 + ) 2\n11*a\nrequire a < 3\n", "a = 3\n[1, 2\n11*a\nrequire a < 3\n"} {
		write(t, file, broken)
		version, body = later(t, address, version)
		for _, want := range []string{"stops at an error in line ", "design.gain:", "of the last run that came so far", "33", "missed"} {
			if !strings.Contains(body, want) {
				t.Errorf("with an error the page lacks %q", want)
			}
		}
	}
	if err := os.Remove(file); err != nil {
		t.Fatal(err)
	}
	version, body = later(t, address, version)
	if !strings.Contains(body, "there is no file") || !strings.Contains(body, "33") {
		t.Error("the page does not say that the file is gone, or lost the report")
	}
	// As editors do that write beside the file and rename.
	write(t, file+".new", "a = 4\n11*a\n")
	if err := os.Rename(file+".new", file); err != nil {
		t.Fatal(err)
	}
	if _, body = later(t, address, version); !strings.Contains(body, "44") {
		t.Error("a file that was put in place of the old one is not seen")
	}
}

// TestAThousandRunsLeaveNothingBehind renews a page as saves do, half of them with errors.
func TestAThousandRunsLeaveNothingBehind(t *testing.T) {
	live, err := newLivePage("127.0.0.1:1")
	if err != nil {
		t.Fatal(err)
	}
	f := &follower{app: &app{digits: 5, errOut: io.Discard}, name: "x.gain", folder: t.TempDir(), live: live}
	heap := func() uint64 {
		runtime.GC()
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		return m.HeapAlloc
	}
	step := func(k int) {
		text := fmt.Sprintf("a = %d\na\n", k)
		if k%2 == 1 {
			text = fmt.Sprintf("b = %d\nc\na\n", k)
		}
		d, failure := newDesign("x.gain", text, f.folder)
		if failure != nil {
			t.Fatal(failure)
		}
		f.run(t.Context(), d)
		if a := live.page(false); a.status != 200 {
			t.Fatal(a.status)
		}
	}
	for k := range 100 {
		step(k)
	}
	before, routines := heap(), runtime.NumGoroutine()
	for k := range 1000 {
		step(k)
	}
	if after := heap(); after > before+2<<20 {
		t.Errorf("the heap grew from %d to %d bytes", before, after)
	}
	if n := runtime.NumGoroutine(); n > routines+2 {
		t.Errorf("goroutines grew from %d to %d", routines, n)
	}
}

// FuzzRequest looks for a request without the token that is answered with the page.
func FuzzRequest(f *testing.F) {
	f.Add("GET / HTTP/1.1\r\nHost: 127.0.0.1:1\r\n\r\n")
	f.Add("GET /next?after=0&token= HTTP/1.0\r\nHost: 127.0.0.1:1\r\nOrigin: null\r\n\r\n")
	live, err := newLivePage("127.0.0.1:1")
	if err != nil {
		f.Fatal(err)
	}
	live.show(report.New(report.Run{Source: diag.NewSource("x.gain", "1\n"), Events: []eval.Event{}}))
	f.Fuzz(func(t *testing.T, text string) {
		r, err := readRequest(strings.NewReader(text))
		if err != nil {
			return
		}
		r.gone = t.Context()
		if a := live.respond(r); a.status == 200 {
			t.Errorf("%q is answered", text)
		}
	})
}
