// Package pictures turns candidates into the charts that window and appendix share.
package pictures
