// Package present turns values, notices and codes into words for people.
package present
