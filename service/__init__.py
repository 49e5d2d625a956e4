"""The web service around `levels`: HTTP, command line and client. Holds no physics."""

VERSION = "0.1.0"
