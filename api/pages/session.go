package pages

import (
	"crypto/hmac"
	"crypto/rand"
	"crypto/sha256"
	"encoding/base64"
	"errors"
	"net/http"
	"net/url"
	"strings"
	"time"

	"jointledger/service"
)

// cookieName is that of the one cookie: the token of a session or, before
// somebody signs in, a random text that only ties forms to the browser.
const cookieName = "jointledger"

func cookieOf(r *http.Request) string {
	c, err := r.Cookie(cookieName)
	if err != nil {
		return ""
	}
	return c.Value
}

// setCookie gives the browser a cookie that no script reads and no other site
// sends. Secure is left out only where the server itself speaks plain HTTP.
func (v *visit) setCookie(value string) {
	c := &http.Cookie{
		Name: cookieName, Value: value, Path: "/", HttpOnly: true, SameSite: http.SameSiteStrictMode,
		Secure: v.r.TLS != nil || v.r.Header.Get("X-Forwarded-Proto") == "https",
	}
	if value == "" {
		c.MaxAge = -1
	} else {
		c.MaxAge = int(service.SessionTime / time.Second)
	}
	http.SetCookie(v.w, c)
	v.cookie = value
}

// browser returns the cookie that forms are tied to, made where there is none.
func (p *Pages) browser(v *visit) string {
	if v.cookie == "" {
		v.setCookie(rand.Text())
	}
	return v.cookie
}

// formToken proves that a form came from a page that this browser was shown:
// no other site can read the cookie or compute this.
func formToken(cookie string) string {
	mac := hmac.New(sha256.New, []byte(cookie))
	mac.Write([]byte("form"))
	return base64.RawURLEncoding.EncodeToString(mac.Sum(nil))
}

// formOf reads a form that was posted and refuses one from elsewhere.
func (p *Pages) formOf(v *visit) error {
	if v.r.Method != http.MethodPost {
		return nil
	}
	v.r.Body = http.MaxBytesReader(v.w, v.r.Body, mostForm)
	if err := v.r.ParseForm(); err != nil {
		return &service.Problem{Code: service.Malformed, Detail: "The form cannot be read, or is larger than 1 MiB."}
	}
	given := []byte(v.r.PostForm.Get("token"))
	if v.cookie == "" || !hmac.Equal(given, []byte(formToken(v.cookie))) || p.origin.Check(v.r) != nil {
		return &service.Problem{Code: service.Forbidden, Detail: "This form was not made by a page that this browser was shown, or its cookie has gone. Go back, load the page again and send it once more."}
	}
	return nil
}

// backTo remembers the page that asked for somebody to sign in.
func backTo(r *http.Request) string {
	return url.Values{"to": {r.URL.RequestURI()}}.Encode()
}

// safeBack is where to go after signing in: a page of this server, nothing
// else.
func safeBack(to string) string {
	u, err := url.Parse(to)
	if err != nil || u.IsAbs() || u.Host != "" || !strings.HasPrefix(to, "/") || strings.HasPrefix(to, "//") || strings.ContainsAny(to, "\\\r\n") {
		return "/"
	}
	return to
}

type signInContent struct {
	To, Wrong string
}

func (p *Pages) signInForm(v *visit) error {
	p.show(v, http.StatusOK, "sign-in", "Sign in", signInContent{To: safeBack(v.r.URL.Query().Get("to"))})
	return nil
}

func (p *Pages) signIn(v *visit) error {
	to := safeBack(v.r.PostForm.Get("to"))
	token, err := p.service.SignIn(v.r.Context(), strings.TrimSpace(v.r.PostForm.Get("key")))
	var problem *service.Problem
	if errors.As(err, &problem) && problem.Code == service.Unauthenticated {
		p.show(v, http.StatusUnauthorized, "sign-in", "Sign in", signInContent{To: to, Wrong: "This API key is not known here, or was revoked."})
		return nil
	}
	if err != nil {
		return err
	}
	v.setCookie(token)
	http.Redirect(v.w, v.r, to, http.StatusSeeOther)
	return nil
}

func (p *Pages) signOut(v *visit) error {
	if err := p.service.SignOut(v.r.Context(), v.cookie); err != nil {
		return err
	}
	v.setCookie("")
	http.Redirect(v.w, v.r, "/sign-in", http.StatusSeeOther)
	return nil
}
