package service

import "slices"

// Role says what a caller may do. Each includes those before it, but for
// Admin, which is Gate and curve sets and neither records nor signs.
type Role string

// The roles.
const (
	Reader   Role = "reader"
	Gate     Role = "gate"
	Analyst  Role = "analyst"
	Checker  Role = "checker"
	Approver Role = "approver"
	Admin    Role = "admin"
	// Local is the caller of open mode, who may everything but sign what it
	// wrote itself.
	Local Role = "local"
)

// Roles are those that a key can have.
func Roles() []Role { return []Role{Reader, Gate, Analyst, Checker, Approver, Admin} }

// May reports whether a role includes a least one.
func (r Role) May(least Role) bool {
	if r == Local {
		return true
	}
	if r == Admin {
		return least == Reader || least == Gate || least == Admin
	}
	ladder := []Role{Reader, Gate, Analyst, Checker, Approver}
	need := slices.Index(ladder, least)
	return need >= 0 && slices.Index(ladder, r) >= need
}
