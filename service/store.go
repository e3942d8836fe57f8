package service

import (
	"context"
	"errors"

	"jointledger/service/ledger"
)

// The errors that a Store returns; any other error of it is a defect.
var (
	// ErrHeadMoved: somebody else appended first; read the head and try again.
	ErrHeadMoved = errors.New("the ledger has moved on")
	// ErrNotFound: there is no such row.
	ErrNotFound = errors.New("not found")
	// ErrUnavailable wraps every failure of the engine or of the way to it.
	// After it an Append may have been stored or not.
	ErrUnavailable = errors.New("the store is unavailable")
)

// Store keeps the ledger. Every method may be called from many goroutines and
// may return ErrUnavailable.
type Store interface {
	// Ready reports whether the engine answers and its schema is this program's.
	Ready(ctx context.Context) error
	// Claim writes the log's identity where there is none yet and returns the
	// one that stands.
	Claim(ctx context.Context, id Identity) (Identity, error)

	// Head returns size, root and checkpoint of the log.
	Head(ctx context.Context) (Head, error)
	// Append writes a batch in one transaction, or nothing. ErrHeadMoved when
	// the head is not batch.Base any more.
	Append(ctx context.Context, batch Batch) error
	// Hashes returns stored tree hashes by their tlog index. ErrNotFound.
	Hashes(ctx context.Context, indexes []int64) ([]ledger.Hash, error)
	// Answered returns what was answered under each idempotency key that is
	// known, by position in keys; nil for the others.
	Answered(ctx context.Context, keys []IdempotencyKey) ([]*Answer, error)

	// Entry returns the entry at an index, EntryByID the one with an id.
	// ErrNotFound.
	Entry(ctx context.Context, index int64) (Entry, error)
	EntryByID(ctx context.Context, id string) (Entry, error)
	// Entries calls yield for from <= index < to, in order, until it fails.
	Entries(ctx context.Context, from, to int64, yield func(Entry) error) error
	// About returns the sign-offs and withdrawals of each record, in order.
	About(ctx context.Context, records []string) (map[string][]Entry, error)
	// Records lists record entries, newest first, at most limit of those
	// under the index before.
	Records(ctx context.Context, filter Filter, before int64, limit int) ([]Summary, error)
	// Latest calls yield with the latest record of each joint, aspect and kind
	// under exactly this part and revision, in order, until it fails; without its
	// terms, which its bytes say too.
	Latest(ctx context.Context, part, revision string, yield func(Entry) error) error

	// Decisions returns the release decisions that rest on each of the records,
	// in the order of the log.
	Decisions(ctx context.Context, records []string) ([]Resting, error)

	// CurveSet returns the entry of the curve set with this id@version, or of
	// the latest with this id. ErrNotFound. CurveSets returns all, in order.
	CurveSet(ctx context.Context, name string) (Entry, error)
	CurveSets(ctx context.Context) ([]Entry, error)

	// Key returns the key with this SHA-256, revoked or not. ErrNotFound.
	Key(ctx context.Context, hash [32]byte) (Key, error)
	// Keys lists all keys in the order of their making.
	Keys(ctx context.Context) ([]Key, error)
	// Touch notes that a key was used.
	Touch(ctx context.Context, id, at string) error

	// AddSession keeps a session and forgets those that have ended by now.
	AddSession(ctx context.Context, session Session, now string) error
	// SessionKey returns the key, revoked or not, of a session that has not
	// ended by now. ErrNotFound.
	SessionKey(ctx context.Context, hash [32]byte, now string) (Key, error)
	// EndSession forgets a session, if there is one.
	EndSession(ctx context.Context, hash [32]byte) error

	// Notify keeps notices to be delivered, but for those whose id is known for
	// their target.
	Notify(ctx context.Context, notices []Notice) error
	// TakeNotices gives out at most limit notices that are due by now, counts
	// an attempt for each, and gives them to nobody else until a time.
	TakeNotices(ctx context.Context, now, until string, limit int) ([]Notice, error)
	// SettleNotice writes that a notice was sent, or, sent being empty, when
	// it is due again.
	SettleNotice(ctx context.Context, id, target, sent, due string) error
	// NoticesWaiting counts those that were not sent yet.
	NoticesWaiting(ctx context.Context) (int64, error)

	// Close lets go of the engine.
	Close() error
}

// Identity is what a log is known by; it never changes.
type Identity struct {
	Origin      string // the first line of its checkpoints
	VerifierKey string // of a signed note
}

// Head is the state of the log.
type Head struct {
	Size       int64
	Root       ledger.Hash
	Checkpoint string // a signed note; empty while Size is 0
}

// Batch is what one transaction appends.
type Batch struct {
	Base    Head    // the head it was made on; its size and root are compared
	Head    Head    // the head it leaves
	Entries []Entry // dense, from index Base.Size
	// Hashes are the tree hashes that the entries add, stored densely from
	// the tlog index ledger.StoredHashCount(Base.Size).
	Hashes  []ledger.Hash
	Answers []Answer
	Keys    []KeyChange
	Notices []Notice
}

// Entry is an entry of the log as stored: its exact bytes, and columns for
// lists and the gate that ColumnsOf makes of them.
type Entry struct {
	Index  int64
	ID     string // UUIDv7
	Type   string
	At     string // UTC RFC 3339 with three decimals; sorts as text
	Author string
	Bytes  []byte // canonical
	Leaf   ledger.Hash
	Columns
}

// Columns repeat what an entry says, for finding it. Text is empty and Margin
// nil where they do not apply.
type Columns struct {
	Subject
	GeometryDigest string
	Kind           string
	Verdict        string
	Margin         *float64
	// Target is the record that a sign-off or withdrawal is about.
	Target string
	// Role is checked or approved, of a sign-off.
	Role string
	// Terms are the methods, materials and curve sets that a record rests on.
	Terms []Term
}

// Term is one name that a record rests on.
type Term struct {
	// Kind is method, material or curve-set of a record, and inline-curve-set
	// beside curve-set where the set came with its input; record of a release
	// decision; an entry of the type curve-set has its own name as curve-set
	// and its id as curve-set-id.
	Kind  string
	Value string
}

// Subject is what a record is about.
type Subject struct {
	Part     string `json:"part" validate:"id"`
	Revision string `json:"revision" validate:"id"`
	Joint    string `json:"joint" validate:"id"`
	Aspect   string `json:"aspect,omitzero" validate:"omitempty,id"`
}

// State is what the entries about a record make of it.
type State string

// The states.
const (
	Recorded  State = "recorded"
	Checked   State = "checked"
	Approved  State = "approved"
	Withdrawn State = "withdrawn"
)

// Filter selects records; an empty field selects all.
type Filter struct {
	Part, Revision, Joint, Kind, Verdict string
	State                                State
	Author, Method, Material, CurveSet   string
	Since, Until                         string // At, inclusive and exclusive
	// Latest keeps only the latest per part, revision, joint, aspect and kind.
	Latest bool
}

// Summary is a record in a list.
type Summary struct {
	Entry // without Bytes and Terms
	State State
}

// Resting is a release decision that rests on a record.
type Resting struct {
	Record   string
	Decision Entry // without Bytes and Terms
}

// Notice is something to be told to another system.
type Notice struct {
	ID       string // the same of every attempt
	Target   string // the name of the system
	Body     []byte
	Due      string // not before this time
	Attempts int    // begun so far
}

// IdempotencyKey is a caller's name for one request.
type IdempotencyKey struct {
	Caller, Method, Path, Key string
}

// Answer remembers what a request with an idempotency key was answered: the
// answer is made again from the entry that it appended.
type Answer struct {
	IdempotencyKey
	RequestDigest [32]byte // SHA-256 of the request's body
	Index         int64    // of the entry
	State         State    // of the record right after, where there is one
}

// Key is an API key of a caller. The key itself is nowhere stored.
type Key struct {
	ID, Caller, Role string
	Hash             [32]byte // SHA-256 of the key
	Added            string
	Revoked          string // empty while it stands
	LastUsed         string // empty until then
}

// KeyChange is an added or revoked key, written with its entry.
type KeyChange struct {
	Add    *Key
	Revoke string // id
	At     string
}

// Session is a browser that signed in with a key. Its token is nowhere stored.
type Session struct {
	Hash  [32]byte // SHA-256 of the token
	Key   string   // id
	Until string
}
