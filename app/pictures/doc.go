// Package pictures turns candidates into the charts, and the words on them, that window, appendix and terminal
// share.
package pictures
