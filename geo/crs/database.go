package crs

import (
	"bytes"
	"compress/gzip"
	"crypto/sha256"
	_ "embed" // the database ships inside the program
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"sync"
)

// shipped is the projection database of PROJ 9.1.1, EPSG edition v10.076, compressed. The library reads a file, so
// that it must be unpacked.
//
//go:embed proj.db.gz
var shipped []byte

// shippedSHA256 is the digest of the unpacked database.
const shippedSHA256 = "2cba929271a6c281f5a56805139e4601328e711dfd6e233fcb234c5209b59995"

// unpackShipped lays the shipped database into the first of the folders that takes it, and gives the folder in which
// proj.db lies then. A file that lies there already is taken only if it is the same to the last bit.
func unpackShipped(folders ...string) (string, error) {
	var whole []byte
	var failed []error
	for _, folder := range folders {
		dir := filepath.Join(folder, "proj-"+shippedSHA256[:16])
		path := filepath.Join(dir, databaseName)
		if have, err := os.ReadFile(path); err == nil && isShipped(have) {
			return dir, nil
		}
		if whole == nil {
			r, err := gzip.NewReader(bytes.NewReader(shipped))
			if err != nil {
				return "", fmt.Errorf("unpack the projection database: %w", err)
			}
			if whole, err = io.ReadAll(r); err != nil {
				return "", fmt.Errorf("unpack the projection database: %w", err)
			}
			if !isShipped(whole) {
				return "", errors.New("the projection database in the program is damaged")
			}
		}
		err := place(dir, path, whole)
		if err == nil {
			return dir, nil
		}
		failed = append(failed, err)
	}
	return "", errors.Join(failed...)
}

const databaseName = "proj.db"

func isShipped(data []byte) bool {
	sum := sha256.Sum256(data)
	return hex.EncodeToString(sum[:]) == shippedSHA256
}

// place writes the file wholly or not at all, whoever else does so at the same time.
func place(dir, path string, data []byte) error {
	if err := os.MkdirAll(dir, 0o700); err != nil {
		return err
	}
	f, err := os.CreateTemp(dir, "new-*")
	if err != nil {
		return err
	}
	defer func() { _ = os.Remove(f.Name()) }() // gone when all went well
	_, err = f.Write(data)
	if cerr := f.Close(); err == nil {
		err = cerr
	}
	if err != nil {
		return err
	}
	return os.Rename(f.Name(), path)
}

// Shared gives the library with the database that ships with the program, so that positions do not depend on the
// machine; grids of datum shifts are looked for where the library finds them by itself. Where the database cannot be
// unpacked, or the library is too new for it, the machine's own database serves, which the editions say.
var Shared = sync.OnceValues(func() (*Library, error) {
	var folders []string
	if cache, err := os.UserCacheDir(); err == nil {
		folders = append(folders, filepath.Join(cache, "groundtally"))
	}
	folders = append(folders, filepath.Join(os.TempDir(), "groundtally"))
	if dir, err := unpackShipped(folders...); err == nil {
		if l, err := open(append([]string{dir}, ownPaths()...)); err == nil {
			return l, nil
		}
	}
	return Open("")
})

// NewTransform makes a transform with the shared library. See Library.NewTransform.
func NewTransform(code string) (*Transform, error) {
	l, err := Shared()
	if l == nil {
		return nil, err
	}
	return l.NewTransform(code)
}
