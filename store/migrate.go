package store

import (
	"crypto/sha256"
	"embed"
	"fmt"
	"io/fs"
	"path"
	"strconv"
	"strings"
)

//go:embed migrations
var migrationFiles embed.FS

// migration is one step of a schema. Steps only go forward, each in one
// transaction, under a lock, and never change once released.
type migration struct {
	version int // from 1
	name    string
	sql     string
	sum     string // hex SHA-256 of sql
}

// migrations returns the steps of an engine in order.
func migrations(files fs.FS, engine string) ([]migration, error) {
	dir := path.Join("migrations", engine)
	names, err := fs.ReadDir(files, dir) // sorted
	if err != nil {
		return nil, err
	}
	var all []migration
	for i, file := range names {
		text, err := fs.ReadFile(files, path.Join(dir, file.Name()))
		if err != nil {
			return nil, err
		}
		number, _, _ := strings.Cut(file.Name(), "_")
		version, err := strconv.Atoi(number)
		if err != nil || version != i+1 {
			return nil, fmt.Errorf("migration %s is not number %d", file.Name(), i+1)
		}
		all = append(all, migration{version, file.Name(), string(text), fmt.Sprintf("%x", sha256.Sum256(text))})
	}
	return all, nil
}

// applied is a step that a database went through.
type applied struct {
	version   int
	name, sum string
}

// pending returns the steps that a database still has to go through. It
// refuses a database of a newer program, and one whose steps were others.
func pending(known []migration, done []applied) ([]migration, error) {
	if len(done) > len(known) {
		return nil, fmt.Errorf("the database has schema version %d and this program knows versions up to %d: start a newer program on it", len(done), len(known))
	}
	for i, d := range done {
		if d.version != known[i].version || d.sum != known[i].sum {
			return nil, fmt.Errorf("step %d (%s) of the database's schema is not this program's: the database was made by another program, or the step was changed after its release", d.version, d.name)
		}
	}
	return known[len(done):], nil
}
