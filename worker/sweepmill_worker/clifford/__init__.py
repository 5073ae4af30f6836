"""The sign-free stabilizer engine; its public face is `engine`."""
