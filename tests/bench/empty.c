/* Does nothing: its start is the share of the system's loader in the start of every program with these libraries. */
int main(void)
{
    return 0;
}
