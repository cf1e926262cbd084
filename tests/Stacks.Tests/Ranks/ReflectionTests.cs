using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

public class ReflectionTests
{
    [Theory]
    [InlineData("abcd", 3, "dcbabcdcba")]
    [InlineData("abcd", 8, "cbabcdcb" + "abcd" + "cbabcdcb")]
    [InlineData("ab", 4, "ababababab")]
    [InlineData("a", 3, "aaaaaaa")]
    public void Edge_sample_is_not_repeated(string axis, int border, string expected)
    {
        char[] extended = [.. Enumerable.Range(-border, axis.Length + (2 * border)).Select(i => axis[Reflection.Index(i, axis.Length)])];
        Assert.Equal(expected, new string(extended));
    }

    [Fact]
    public void Any_place_is_where_a_walk_to_and_fro_ends()
    {
        for (int length = 1; length <= 12; length++)
        {
            for (int place = -60; place <= 60; place++)
                Assert.Equal(RankScene<int>.Walk(place, length), Reflection.Index(place, length));
        }
    }
}
