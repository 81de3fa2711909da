/*
 * nothing.c: a process that does nothing, for the row `review`.
 */
int main(void)
{
    return 0;
}
