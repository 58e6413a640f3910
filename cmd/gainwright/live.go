package main

import (
	"bytes"
	"context"
	"crypto/rand"
	"crypto/subtle"
	"encoding/hex"
	"fmt"
	"html"
	"net"
	"strconv"
	"sync"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/report"
)

// livePage serves one report, the latest, to browsers of this machine that know the token.
// Each answer is made anew from the document that is held, so that nothing gathers.
type livePage struct {
	host  string // address and port that requests must name
	token string

	mutex    sync.Mutex
	document *report.Document
	problem  string // why there is no document yet, or no newer one
	version  int
	changed  chan struct{} // closed when there is a later version
	waiting  int
}

const (
	mostWaiting = 32               // pages that wait for a later version at once
	longestWait = 20 * time.Second // before a page is told to ask again
	tokenBytes  = 16
)

func newLivePage(host string) (*livePage, error) {
	token, err := randomWord()
	if err != nil {
		return nil, diag.New(diag.File, "no random word can be made: %v", err)
	}
	return &livePage{host: host, token: token, changed: make(chan struct{})}, nil
}

func randomWord() (string, error) {
	b := make([]byte, tokenBytes)
	if _, err := rand.Read(b); err != nil {
		return "", err
	}
	return hex.EncodeToString(b), nil
}

func (l *livePage) address() string { return "http://" + l.host + "/?token=" + l.token }

// show takes a new document.
func (l *livePage) show(doc *report.Document) { l.renew(doc, "") }

// trouble says that the file cannot be read; the last document stays.
func (l *livePage) trouble(text string) { l.renew(nil, text) }

// isFine tells whether the document shown is that of the file as it can be read.
func (l *livePage) isFine() bool {
	l.mutex.Lock()
	defer l.mutex.Unlock()
	return l.document != nil && l.problem == ""
}

func (l *livePage) renew(doc *report.Document, problem string) {
	l.mutex.Lock()
	defer l.mutex.Unlock()
	if doc != nil {
		l.document = doc
	}
	l.problem = problem
	l.version++
	close(l.changed)
	l.changed = make(chan struct{})
}

// serve answers until the context ends.
func (l *livePage) serve(ctx context.Context, listener net.Listener) error {
	if err := serveLoopback(ctx, listener, l.respond); err != nil {
		return diag.New(diag.File, "the page cannot be served any longer: %v", err)
	}
	return nil
}

// safe headers stand in every answer.
var safe = [][2]string{
	{"X-Content-Type-Options", "nosniff"},
	{"Referrer-Policy", "no-referrer"},
	{"Cache-Control", "no-store"},
	{"Cross-Origin-Resource-Policy", "same-origin"},
	{"Cross-Origin-Opener-Policy", "same-origin"},
}

// nothingAllowed is the policy of what is no report.
const nothingAllowed = "default-src 'none'; frame-ancestors 'none'; base-uri 'none'; form-action 'none'"

// respond answers for the report and nothing else. A request must name this address as
// its host (a name that was pointed at this machine does not), come from the page itself
// or from the address line, and hold the token.
func (l *livePage) respond(r *request) answer {
	site := r.header.Get("Sec-Fetch-Site")
	origin, hasOrigin := r.header["Origin"]
	query := r.url.Query()
	switch {
	case r.method != "GET":
		return refuse(405)
	case r.header.Get("Host") != l.host,
		hasOrigin && origin[0] != "http://"+l.host,
		site != "" && site != "same-origin" && site != "none",
		!l.knows(query.Get("token")):
		return refuse(403)
	case r.url.Path == "/":
		return l.page(false)
	case r.url.Path == "/next":
		return l.next(r.gone, query.Get("after"))
	}
	return refuse(404)
}

func refuse(status int) answer {
	header := append([][2]string{{"Content-Type", "text/plain; charset=utf-8"}, {"Content-Security-Policy", nothingAllowed}}, safe...)
	if status == 405 {
		header = append(header, [2]string{"Allow", "GET"})
	}
	return answer{status: status, header: header, body: []byte(reasons[status] + "\n")}
}

func (l *livePage) knows(token string) bool {
	return subtle.ConstantTimeCompare([]byte(token), []byte(l.token)) == 1
}

// next answers with the page as soon as it is later than the version named.
func (l *livePage) next(gone context.Context, after string) answer {
	shown, err := strconv.Atoi(after)
	if err != nil {
		return refuse(400)
	}
	l.mutex.Lock()
	if l.waiting >= mostWaiting {
		l.mutex.Unlock()
		return refuse(503)
	}
	l.waiting++
	version, changed := l.version, l.changed
	l.mutex.Unlock()
	defer func() {
		l.mutex.Lock()
		l.waiting--
		l.mutex.Unlock()
	}()
	if version != shown {
		return l.page(true)
	}
	timer := time.NewTimer(longestWait)
	defer timer.Stop()
	select {
	case <-changed:
		return l.page(true)
	case <-timer.C:
	case <-gone.Done():
	}
	return answer{status: 204, header: safe}
}

// page is the report with a policy of its own: the one script and the one style sheet are
// known by a word that no text can guess. One that renews a page comes without them.
func (l *livePage) page(renews bool) answer {
	l.mutex.Lock()
	doc, problem, version := l.document, l.problem, l.version
	l.mutex.Unlock()
	nonce, err := randomWord()
	if err != nil {
		return refuse(500)
	}
	var b bytes.Buffer
	if doc == nil {
		fmt.Fprintf(&b, "<!DOCTYPE html><title>no report</title><p>%s</p>", html.EscapeString(problem))
	} else if err := doc.LiveHTML(&b, report.Live{Nonce: nonce, Version: version, Renews: renews, Problem: problem}); err != nil {
		return refuse(500)
	}
	policy := "default-src 'none'; img-src data:; style-src 'nonce-" + nonce + "'; script-src 'nonce-" + nonce +
		"'; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'"
	return answer{status: 200, body: b.Bytes(), header: append([][2]string{
		{"Content-Type", "text/html; charset=utf-8"}, {"Content-Security-Policy", policy}, {"X-Report-Version", strconv.Itoa(version)}}, safe...)}
}
