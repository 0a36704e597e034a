// The isinglass program.
int main() {
  return 0;
}
